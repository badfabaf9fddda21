"""What figures show: theory's curves, arrows, edges and numbers, and what they leave out."""

from __future__ import annotations

import logging
import math

import numpy as np
import pytest
from matplotlib.quiver import Quiver
from pictured import EDDY, FRONT, changed, eddy_run, figures_of, front_run, stored_run
from PIL import Image

from swmodel.pictures import draw
from swmodel.pictures.scene import NoPictureError

WALLS = 'west = "wall"\neast = "wall"\nsouth = "periodic"\nnorth = "periodic"'
TURNED = 'west = "periodic"\neast = "periodic"\nsouth = "wall"\nnorth = "wall"'


@pytest.fixture(scope="module")
def front(tmp_path_factory):
    return figures_of(front_run(tmp_path_factory.mktemp("pictures") / "front"))


@pytest.fixture(scope="module")
def eddy(tmp_path_factory):
    return figures_of(eddy_run(tmp_path_factory.mktemp("pictures") / "eddy"))


def dashed(axes):
    """The dashed line of axes: what is expected."""
    (line,) = [line for line in axes.lines if line.is_dashed()]
    return np.asarray(line.get_xdata()), np.asarray(line.get_ydata())


# ---------------------------------------------------------------------------------------------------------- the map


def test_a_thin_domain_is_drawn_against_time_where_a_map_is_asked_for(tmp_path):
    folder = front_run(tmp_path / "front")
    (path,) = draw(folder, only=["map"])
    assert path.name == "time_distance.png"
    with Image.open(path) as image:
        # 550 km by 17 km to scale would be 1440 by some 50 pixels
        assert image.height > 600
    figure = figures_of(folder, "map")["time_distance"]
    assert "4 cells lie across y" in " ".join(text.get_text() for text in figure.texts)
    panels = [axes for axes in figure.axes if axes.images]
    assert [axes.get_title(loc="left") for axes in panels] == ["elevation η", "u, along x", "v, along y"]
    for axes in panels:
        assert axes.get_xlim() == pytest.approx((-275, 275))
        assert axes.get_ylim() == pytest.approx((0, 3.6))


def test_a_domain_thin_along_x_is_drawn_along_y(tmp_path):
    edits = [
        ("cells = [128, 4]", "cells = [4, 128]"),
        ('"550 km", "17 km"', '"17 km", "550 km"'),
        ("sign(x)", "sign(y)"),
    ]
    edits += [('along = "x"', 'along = "y"')]
    edits += [(WALLS, TURNED)]

    def state(basin, t):
        return 0.0, 0.0, 0.5 * np.sign(basin.grid.y)[:, None]

    folder = stored_run(tmp_path / "front", changed(FRONT, *edits), state)
    figure = figures_of(folder, "map")["time_distance"]
    axes = figure.axes[0]
    assert axes.get_xlabel() == "y (km)"
    values = np.asarray(axes.images[0].get_array())
    assert (values[0, 0], values[0, -1]) == (-0.5, 0.5)


def test_a_long_channel_is_stretched_and_says_so(tmp_path):
    folder = eddy_run(tmp_path / "long", changed(EDDY, ('"400 km", "300 km"', '"6000 km", "300 km"')))
    figure = figures_of(folder, "map")["map"]
    box = figure.axes[0].get_window_extent()
    # 20 to 1; drawn no thinner than 0.15 to 1
    assert box.height / box.width == pytest.approx(0.15, rel=0.01)
    assert "y is stretched 3 times against x" in " ".join(text.get_text() for text in figure.texts)


def test_a_map_that_is_not_stretched_is_to_scale(eddy):
    box = eddy["map"].axes[0].get_window_extent()
    # 300 km over 400 km; pixels round to a part in a thousand
    assert box.height / box.width == pytest.approx(0.75, rel=2e-3)


def test_arrows_are_few_enough_to_read_and_turn_as_the_flow_does(eddy):
    figure = eddy["map"]
    (start,) = figure.axes[0].findobj(Quiver)
    x, y = np.asarray(start.X), np.asarray(start.Y)
    u, v = np.asarray(start.U), np.asarray(start.V)
    known = ~np.broadcast_to(start.Umask, u.shape)
    assert 20 < np.count_nonzero(known) < 400
    # a high turns anticlockwise in the south: the torque of every arrow about its middle is positive
    x, y = np.broadcast_arrays(x.reshape(u.shape), y.reshape(u.shape))
    assert np.all((x * v - y * u)[known] > 0)


def test_walls_are_heavy_and_periodic_sides_dashed(eddy):
    spines = eddy["map"].axes[0].spines
    assert spines["bottom"].get_linewidth() > 2 * spines["left"].get_linewidth()
    assert spines["left"].get_linestyle() != "-"
    assert spines["bottom"].get_linestyle() in ("-", "solid")


def test_what_was_stored_of_a_part_of_the_domain_is_drawn_where_it_lies(tmp_path):
    region = 'region = ["-90 km", "180 km", "-150 km", "120 km"]\nstride = 3'
    folder = eddy_run(tmp_path / "part", changed(EDDY, ('every = "1 h"', f'every = "1 h"\n{region}')))
    axes = figures_of(folder, "map")["map"].axes[0]
    assert axes.get_xlim() == pytest.approx((-90, 180))
    assert axes.get_ylim() == pytest.approx((-150, 120))
    assert len(draw(folder)) == 5


# ------------------------------------------------------------------------------------------------------ the section


def test_the_section_shows_the_end_state_of_a_step_with_its_sign(front):
    elevation, velocity = front["section"].axes
    x, eta = dashed(elevation)
    # 45 deg: f = 2 (7.292115e-5 rad/s) sin 45 deg, c = sqrt(2) m/s: a = 13.713 km; eta(a) = 0.5 m (1 - 1/e) = 31.6 cm
    at = np.interp(13.713, x, eta)
    # the curve is drawn every 0.275 km, linear between
    assert at == pytest.approx(31.6 if np.max(eta) > 1 else 0.316, rel=2e-3)
    _, v = dashed(velocity)
    # at the step v = eta0 sqrt(g/H) = 0.5 m sqrt(0.02/100)/s = 0.707 cm/s, northward with higher surface to the east
    assert np.max(v) == pytest.approx(0.7071, rel=1e-4)
    assert np.min(v) >= 0


def test_in_the_south_the_current_of_the_step_runs_the_other_way(tmp_path):
    folder = front_run(tmp_path / "south", changed(FRONT, ('"45 deg"', '"-45 deg"')))
    _, velocity = figures_of(folder, "section")["section"].axes
    x, v = dashed(velocity)
    assert v[np.argmin(np.abs(x))] == pytest.approx(-0.7071, rel=1e-4)
    measured = velocity.lines[2].get_ydata()
    assert np.min(measured) < -0.5


def test_a_step_along_y_has_its_current_toward_minus_x_in_the_north(tmp_path):
    edits = [("cells = [128, 4]", "cells = [16, 64]"), ("sign(x)", "sign(y)"), ('along = "x"', 'along = "y"')]
    edits += [('"550 km", "17 km"', '"100 km", "550 km"')]
    edits += [(WALLS, TURNED)]

    def state(basin, t):
        return 0.0, 0.0, 0.5 * np.sign(basin.grid.y)[:, None]

    folder = stored_run(tmp_path / "front", changed(FRONT, *edits), state)
    elevation, velocity = figures_of(folder, "section")["section"].axes
    assert elevation.get_xlabel() == ""
    assert velocity.get_xlabel() == "y (km)"
    # geostrophy: u = -(g/f) d eta/dy, negative where eta rises northward and f > 0
    assert np.min(dashed(velocity)[1]) == pytest.approx(-0.7071, rel=1e-4)


@pytest.mark.parametrize(
    ("why", "edits"),
    [
        ("periodic: two steps", [('west = "wall"\neast = "wall"', 'west = "periodic"\neast = "periodic"')]),
        ("uneven depth", [('depth = "100 m"', 'depth = "100 + 10 * cos(x/1e5)"')]),
        ("f varies", [('latitude = "45 deg"', 'latitude = "45 deg"\nplane = "beta"')]),
        ("no rotation", [('latitude = "45 deg"', 'plane = "none"\nbody = "earth"')]),
    ],
)
def test_theory_of_the_step_is_drawn_only_where_it_holds(why, edits, tmp_path):
    edits = [*edits, ('value = "deformation_radius"', 'value = "20 km"')]

    def state(basin, t):
        return 0.0, 0.0, 0.5 * np.sign(basin.grid.x) * (1 - 0.9 * (t > 0) * np.exp(-np.abs(basin.grid.x) / 14e3))

    folder = stored_run(tmp_path / "front", changed(FRONT, *edits), state)
    elevation, velocity = figures_of(folder, "section")["section"].axes
    labels = [line.get_label() for line in elevation.lines if line.is_dashed()]
    # what is left is the curve with the value that was expected
    assert labels == ["expected: 20\u00a0km"], why
    assert not any(line.is_dashed() for line in velocity.lines)


def test_where_all_the_flow_runs_along_the_line_it_is_what_is_shown(tmp_path):
    folder = stored_run(tmp_path / "slosh", FRONT, lambda basin, t: (0.1, 0.0, 0.1 * np.sin(basin.grid.x / 1e5)))
    figures = figures_of(folder, "section", "time_distance")
    assert [axes.get_ylabel() for axes in figures["section"].axes] == ["elevation η (cm)", "velocity u (cm/s)"]
    titles = [axes.get_title(loc="left") for axes in figures["time_distance"].axes if axes.images]
    assert titles == ["elevation η", "u, along x"]


def test_single_precision_is_not_measured_by_the_round_off_of_double(tmp_path):
    text = changed(FRONT, ("cells = [128, 4]", 'cells = [128, 4]\nprecision = "single"'))
    *_, budget = figures_of(front_run(tmp_path / "front", text), "energy")["energy"].axes
    assert not any(line.is_dashed() for line in budget.lines)


def test_a_moving_or_a_smooth_start_is_no_step(tmp_path):
    for name, u, shape in (("moving", 0.1, np.sign), ("smooth", 0.0, lambda x: np.tanh(x / 1e4))):
        folder = stored_run(
            tmp_path / name, FRONT, lambda basin, t, u=u, shape=shape: (u, 0.0, 0.5 * shape(basin.grid.x))
        )
        elevation, _ = figures_of(folder, "section")["section"].axes
        assert not any("theory" in str(line.get_label()) for line in elevation.lines)


# -------------------------------------------------------------------------------------------- energy and expectations


def test_the_energy_figure_says_how_much_energy_drifts_and_how_well_the_budget_closes(front):
    figure = front["energy"]
    words = " ".join(text.get_text() for text in figure.texts)
    # 18 intervals of 1e-9 each; largest residual 18e-15 over the largest term, 3
    assert "Energy changes by −1.8·10⁻⁸ of its start in 3.6\u00a0day" in words
    assert "closes to 6·10⁻¹⁵ of the largest term" in words
    form, drift, budget = figure.axes
    assert drift.lines[1].get_ydata()[-1] == pytest.approx(-18, rel=1e-6)
    assert drift.get_ylabel() == "drift of the sum (10⁻⁹)"
    assert budget.get_yscale() == "log"
    assert form.get_ylabel() == "energy (% of the start)"


def test_an_expectation_shows_points_fit_and_the_same_curve_with_the_expected_value(front):
    main, ruler = front["expectation-1"].axes
    points, fit, expected = main.lines
    at, values = np.asarray(points.get_xdata()), np.asarray(points.get_ydata())
    # 70 km of cells of 550 km/128
    assert at.size == 16
    across = np.interp(at, fit.get_xdata(), fit.get_ydata())
    # the mean over two inertial periods is an exponential to some 4 %
    assert np.max(np.abs(across - values)) < 0.04 * np.max(values)
    assert fit.get_label().startswith("fit: ")
    assert expected.get_label() == "expected: 13.7\u00a0km" or expected.get_label().startswith("expected: 13.71")
    assert expected.is_dashed()
    # a curve with another length departs from the points
    assert ruler.get_xlabel() == "decay length (km)"
    assert [text.get_text() for text in ruler.texts] == ["holds"]


def test_the_grey_band_is_what_is_allowed(front):
    _, ruler = front["expectation-1"].axes
    band = ruler.patches[0].get_extents().transformed(ruler.transData.inverted())
    # a = 13.713 km (see above), 8 % of it on either side
    assert (band.x0, band.x1) == pytest.approx((0.92 * 13.713, 1.08 * 13.713), rel=1e-3)


def test_an_expectation_that_cannot_be_measured_still_has_its_figure_with_the_reason(tmp_path):
    late = changed(FRONT, ('during = ["2.2 day", "3.6 day"]', 'during = ["9 day", "10 day"]'))
    figure = figures_of(front_run(tmp_path / "front", late), "expectation")["expectation-1"]
    words = " ".join(text.get_text() for text in figure.texts)
    assert figure.axes == []
    assert "undecided: expected" in words
    assert "10 day lies outside the run" in words


def test_a_turning_velocity_is_drawn_as_u_and_v(tmp_path):
    expect = """
[[expect]]
claim = "The flow turns clockwise"
measure = { kind = "frequency", of = "velocity", at = [0, 0] }
value = "-7e-4 rad/s"
within = "1 %"
because = "it was made so"
"""
    folder = stored_run(
        tmp_path / "turning",
        changed(EDDY, ("10 h", "5 h"), ("1 h", "10 min")) + expect,
        lambda basin, t: (0.1 * math.cos(7e-4 * t), -0.1 * math.sin(7e-4 * t), 0.01),
    )
    main, _ = figures_of(folder, "expectation")["expectation-2"].axes
    assert [line.get_label() for line in main.lines[:2]] == ["u, points", "v, points"]
    u, v = (np.asarray(line.get_ydata()) for line in main.lines[:2])
    # cm/s: 0.1 m/s in all directions
    assert np.hypot(u, v) == pytest.approx(np.full(u.size, 10.0), rel=1e-6)


def test_a_crest_is_expected_where_its_speed_takes_it(tmp_path):
    expect = """
[[expect]]
claim = "The crest goes east at 2 m/s"
measure = { kind = "phase_speed", of = "eta", along = "x", at = 0 }
value = "2 m/s"
within = "2 %"
because = "it was made so"
"""
    k, c = 2 * math.pi / 400e3, 2.0
    text = changed(EDDY, ("10 h", "100 h"), ("1 h", "5 h")) + expect
    folder = stored_run(tmp_path / "wave", text, lambda basin, t: (0.0, 0.0, np.cos(k * (basin.grid.x - c * t))))
    axes = figures_of(folder, "time_distance")["time_distance"].axes[0]
    x, days = dashed(axes)
    known = np.isfinite(x)
    crest = c * days[known] * 86.4  # km
    miss = (x[known] - crest + 200) % 400 - 200
    # a tenth of a cell of 10 km
    assert np.max(np.abs(miss)) < 1.0


# --------------------------------------------------------------------------------------------------- what is missing


def test_what_was_not_stored_is_left_out_and_the_log_says_why(tmp_path, caplog):
    folder = eddy_run(tmp_path / "flow", changed(EDDY, ('every = "1 h"', 'every = "1 h"\nfields = ["u", "v"]')))
    with caplog.at_level(logging.WARNING):
        names = [path.stem for path in draw(folder)]
    assert names == ["energy", "expectation-1"]
    assert "no figure map: eta was not stored" in caplog.messages


def test_without_velocity_the_map_has_no_arrows_and_says_so(tmp_path):
    folder = eddy_run(tmp_path / "eta", changed(EDDY, ('every = "1 h"', 'every = "1 h"\nfields = ["eta"]')))
    figure = figures_of(folder, "map")["map"]
    assert not figure.findobj(Quiver)
    assert "no arrows: u and v were not stored" in " ".join(text.get_text() for text in figure.texts)


def test_a_run_that_has_stored_its_start_alone_has_a_map_of_it(tmp_path):
    folder = eddy_run(tmp_path / "begun", changed(EDDY, ('every = "1 h"', 'every = "30 h"')))
    figure = figures_of(folder, "map")["map"]
    assert len([axes for axes in figure.axes if axes.images]) == 1
    with pytest.raises(NoPictureError, match="1 snapshots make no time-distance diagram"):
        figures_of(folder, "time_distance")
    assert [path.stem for path in draw(folder)] == ["map", "section", "expectation-1"]


def test_an_elevation_that_has_died_down_is_shown_on_a_scale_of_its_own(tmp_path):
    folder = stored_run(tmp_path / "dying", EDDY, lambda basin, t: (0.0, 0.0, 0.2 * 10 ** (-t / 3600)))
    figure = figures_of(folder, "map")["map"]
    first, last = (axes.images[0].norm.vmax for axes in figure.axes if axes.images)
    # 0.2 m and, after 10 h, 2e-11 m
    assert (first, last) == pytest.approx((0.2, 2e-11))
    assert len([axes for axes in figure.axes if axes.get_xlabel().startswith("elevation η")]) == 2
