"""Pictures: what is drawn from a run's folder, that it can be read, and that its curves are theory's."""

from __future__ import annotations

import itertools
import math
import subprocess
import sys
import zlib

import matplotlib
import numpy as np
import pytest
from matplotlib.image import AxesImage, imread
from matplotlib.text import Text
from pictured import EDDY, FRONT, changed, eddy_run, figures_of, front_run, stored_run
from PIL import Image

from swmodel.errors import MachineError, RequestError
from swmodel.pictures import FIGURES, draw
from swmodel.pictures.page import our_style, wrapped

FRONT_IMAGES = ["time_distance", "section", "energy", "expectation-1", "expectation-2"]
EDDY_IMAGES = ["map", "time_distance", "section", "energy", "expectation-1"]
LONG_TITLE = "Costs $5 and $6 " + "of a very long question about the made-up sea " * 8 + "x" * 150


@pytest.fixture(scope="module")
def front(tmp_path_factory):
    return front_run(tmp_path_factory.mktemp("pictures") / "front")


@pytest.fixture(scope="module")
def eddy(tmp_path_factory):
    return eddy_run(tmp_path_factory.mktemp("pictures") / "eddy")


@pytest.fixture(scope="module")
def front_images(front):
    return draw(front)


@pytest.fixture(scope="module")
def eddy_images(eddy):
    return draw(eddy)


@pytest.mark.parametrize(
    ("images", "names", "claim"),
    [
        ("front_images", FRONT_IMAGES, "Energy stays"),
        ("eddy_images", EDDY_IMAGES, "The eddy stays as high as it is"),
    ],
)
def test_every_figure_is_a_png_of_readable_size_with_its_claim_inside(images, names, claim, request):
    paths = request.getfixturevalue(images)
    assert [path.name for path in paths] == [f"{name}.png" for name in names]
    assert {path.parent.name for path in paths} == {"figures"}
    assert sorted(paths[0].parent.iterdir()) == sorted(paths)
    for path in paths:
        with Image.open(path) as image:
            assert image.format == "PNG"
            assert 1200 <= image.width <= 1600
            assert 400 <= image.height <= 2200
            assert "not for navigation" in image.text["Comment"]
            assert image.text["Software"] == "swmodel 0.1.0"
            assert len(image.text["Title"]) > 10
    with Image.open(paths[-1]) as image:
        assert image.text["Title"] == claim


def test_no_figure_is_blank(front_images, eddy_images):
    for path in (*front_images, *eddy_images):
        pixels = imread(path)[..., :3]
        # a page of text alone covers some 1 %; a panel with its axes and curves doubles that at least
        assert np.mean(np.any(pixels < 0.9, axis=-1)) > 0.015, path.name
        # in the middle of the page, where the panels stand, something is drawn
        assert np.any(pixels[pixels.shape[0] // 3 : pixels.shape[0] // 2] < 0.7), path.name


def test_drawing_again_gives_the_same_bytes_and_touches_nothing_else(front, front_images):
    before = {path: zlib.crc32(path.read_bytes()) for path in front.rglob("*") if path.is_file()}
    with matplotlib.rc_context({"lines.linewidth": 17.0, "font.size": 3.0}):
        mine = dict(matplotlib.rcParams)
        draw(front, only=["section", "energy"])
        # the user's own settings neither reach the figure nor are changed by it
        assert dict(matplotlib.rcParams) == mine
    assert {path: zlib.crc32(path.read_bytes()) for path in front.rglob("*") if path.is_file()} == before


def test_only_what_is_asked_for_is_drawn(eddy, tmp_path):
    folder = eddy_run(tmp_path / "eddy")
    assert [path.name for path in draw(folder, only=["energy", "map"])] == ["energy.png", "map.png"]
    assert draw(folder, only=[]) == []


def test_a_wrong_name_of_a_figure_is_told_with_the_nearest_right_one(front):
    with pytest.raises(RequestError) as caught:
        draw(front, only=["sections", "map"])
    names = "one of map, time_distance, section, energy, expectation"
    assert str(caught.value) == f'there is no figure "sections"; {names}; did you mean "section"?'


def test_a_folder_that_is_no_runs_is_refused(tmp_path):
    with pytest.raises(RequestError, match="is not a run's folder"):
        draw(tmp_path)


def test_figures_that_cannot_be_written_are_the_machines_failure(tmp_path):
    folder = front_run(tmp_path / "front")
    (folder / "figures").write_text("in the way")
    with pytest.raises(MachineError, match="cannot write"):
        draw(folder)


def test_listings_load_no_plotting_library():
    code = "import sys\nfrom swmodel.pictures import FIGURES\n"
    code += "print(sorted({'matplotlib', 'h5py', 'numba'} & set(sys.modules)))"
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True)
    assert done.stdout.strip() == "[]"


def test_drawing_needs_no_display_and_no_global_figures(front):
    code = f"import sys\nfrom swmodel.pictures import draw\ndraw({str(front)!r}, only=['map', 'energy'])\n"
    code += "print('matplotlib.pyplot' in sys.modules)"
    done = subprocess.run([sys.executable, "-W", "error", "-c", code], capture_output=True, text=True, check=True)
    assert (done.stdout.strip(), done.stderr) == ("False", "")


@pytest.mark.parametrize("name", FIGURES)
def test_every_row_says_what_it_is_and_where_it_comes_from(name):
    assert 10 < len(FIGURES[name].meaning) < 120
    assert FIGURES[name].source


# --------------------------------------------------------------------------------------------------- what can be read


def runs(tmp_path):
    """Runs of many shapes, by a word."""
    yield "front", front_run(tmp_path / "front", changed(FRONT, ("A step in the made-up Sarn Bank", LONG_TITLE)))
    yield "high channel", eddy_run(tmp_path / "high", changed(EDDY, ('"400 km", "300 km"', '"400 km", "3000 km"')))
    yield "long channel", eddy_run(tmp_path / "long", changed(EDDY, ('"400 km", "300 km"', '"6000 km", "300 km"')))
    yield "tank", stored_run(tmp_path / "tank", TANK, lambda basin, t: (1e-3, -2e-3, 1e-4 * np.cos(basin.grid.x + t)))
    yield "rest", stored_run(tmp_path / "rest", EDDY, lambda basin, t: (0.0, 0.0, 0.0))


TANK = changed(
    EDDY,
    ('latitude = "-30 deg"', 'plane = "tank"\nrotation_rate = "10 rpm"'),
    ('"500 m"', '"10 cm"'),
    ('"400 km", "300 km"', '"60 cm", "45 cm"'),
    ('eta = "0.2 * exp(-(x**2 + y**2)/5e4**2)"', "eta = 0.0001"),
    ("10 h", "20 s"),
    ("1 h", "2 s"),
)


def test_no_text_is_cut_off_or_lies_on_another(tmp_path):
    for word, folder in runs(tmp_path):
        for name, figure in figures_of(folder).items():
            with our_style():
                figure.canvas.draw()
            renderer = figure.canvas.get_renderer()
            hidden = set(beyond(figure))
            texts = [text for text in figure.findobj(Text) if text.get_visible() and text.get_text().strip()]
            shown = [(text.get_text(), text.get_window_extent(renderer)) for text in texts if text not in hidden]
            assert len(shown) > 4
            for text, box in shown:
                inside = box.x0 >= 0 and box.y0 >= 0 and box.x1 <= figure.bbox.x1 and box.y1 <= figure.bbox.y1
                assert inside, f"{word}, {name}: {text!r} is cut off"
            for (one, a), (other, b) in itertools.combinations(shown, 2):
                # lines of a paragraph may touch by the pixel of their rounding
                lies_on = min(a.x1, b.x1) - max(a.x0, b.x0) > 1 and min(a.y1, b.y1) - max(a.y0, b.y0) > 1.5
                assert not lies_on, f"{word}, {name}: {one!r} lies on {other!r}"


def beyond(figure):
    """Labels of ticks that lie outside the limits of their axes, which are not drawn."""
    for axes in figure.axes:
        for axis in (axes.xaxis, axes.yaxis):
            low, high = sorted(axis.get_view_interval())
            slack = 1e-9 * (high - low)
            for tick in (*axis.get_major_ticks(), *axis.get_minor_ticks()):
                if not low - slack <= tick.get_loc() <= high + slack:
                    yield from (tick.label1, tick.label2)


def test_lines_are_broken_at_blanks_alone_and_words_too_long_are_cut():
    text = "one two\u00a0km three\n four " + "x" * 300
    lines = wrapped(text, 8.0, width=1.0)
    assert "".join(lines).replace(" ", "") == "onetwo\u00a0kmthreefour" + "x" * 300
    assert not any(line.endswith("two") for line in lines)
    assert wrapped("", 8.0) == []
    assert wrapped("xx", 8.0, width=0.001) == ["x", "x"]


def test_signed_fields_are_centred_on_zero(front, eddy):
    images = [
        image
        for folder in (front, eddy)
        for figure in figures_of(folder).values()
        for image in figure.findobj(AxesImage)
    ]
    assert len(images) == 6  # eta, u, v against time; two maps, and eta against time
    for image in images:
        assert image.norm.vmin == -image.norm.vmax
        assert np.nanmax(np.abs(image.get_array())) <= image.norm.vmax


def test_ticks_are_round_numbers_with_units_on_every_axis(front, eddy):
    for folder in (front, eddy):
        for name, figure in figures_of(folder, "map", "time_distance", "section").items():
            for axes in figure.axes:
                if axes.get_window_extent().height < 40:
                    continue  # a colour bar: its ends are round, and half of them
                for axis in (axes.xaxis, axes.yaxis):
                    steps = np.diff(axis.get_majorticklocs())
                    mantissa = steps[0] / 10 ** math.floor(math.log10(steps[0]) + 1e-9)
                    assert mantissa == pytest.approx(round(mantissa), abs=1e-9)
                    assert round(mantissa) in (1, 2, 3, 5, 6), name
                    label = axis.get_label_text()
                    assert label == "" or label.endswith(")"), label
