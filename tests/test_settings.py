"""Settings: a file to an experiment, other values, settings.json, and nothing but a request error for bad input."""

from __future__ import annotations

import copy
import datetime
import json
import math
import pickle
import subprocess
import sys
from collections.abc import Callable
from pathlib import Path
from typing import Any

import pytest
import tomli
from configurations import FRONT, changed
from hypothesis import given, settings
from hypothesis import strategies as st
from pydantic import ValidationError

from swmodel.errors import Fault, RequestError
from swmodel.fields import FileVariable, Formula
from swmodel.grid import EdgesSettings
from swmodel.quantities import Percentage
from swmodel.settings import Experiment, read


@pytest.fixture
def front(tmp_path: Path) -> Path:
    """Return the file of a whole configuration."""
    path = tmp_path / "front.toml"
    path.write_text(FRONT)
    return path


def experiment(tmp_path: Path, *edits: tuple[str, str], sets: dict[str, str] | None = None) -> Experiment:
    path = tmp_path / "front.toml"
    path.write_text(changed(*edits))
    return read(path, sets)


def test_a_configuration_is_read_into_si(front: Path) -> None:
    read_in = read(front)
    assert read_in.frame.latitude == math.pi / 4
    assert read_in.layer.depth == 100.0
    assert read_in.layer.reduced_gravity == 0.02
    assert read_in.grid.cells == (1024, 4)
    assert read_in.grid.size == (550e3, 2148.4375)
    assert read_in.start[0].eta == Formula("0.5 * sign(x)")
    assert read_in.numerics.linear is True
    assert read_in.time.until == 311040.0
    assert read_in.output.every == 3600.0
    assert read_in.expect[0].value == "deformation_radius"
    assert read_in.expect[0].within == Percentage(8.0)
    assert read_in.expect[0].measure.during == (190080.0, 311040.0)


def test_what_is_not_written_has_the_documented_default(tmp_path: Path) -> None:
    # source: the table of defaults in the configuration reference
    read_in = experiment(
        tmp_path,
        ('body = "earth"\n', ""),
        ('plane = "f"\n', ""),
        ('origin = "centre"', ""),
        ('precision = "double"', ""),
        ('[numerics]\npv_flux = "both"\nlinear = true\n', ""),
        ('stepper = "ssprk3"\n', ""),
        ('[output]\nevery = "1 h"\nfields = ["eta", "u", "v"] ', ""),
        ('diagnostics_every = "1 h"\n', ""),
    )
    assert (read_in.frame.plane, read_in.grid.origin, read_in.grid.precision) == ("f", "centre", "double")
    assert read_in.edges.slip == "free"
    assert (read_in.numerics.pv_flux, read_in.numerics.linear) == ("both", False)
    time = read_in.time
    assert (time.stepper, time.step, time.margin, time.filter, time.williams) == ("ssprk3", "auto", 0.7, 0.1, 0.7)
    assert time.start == datetime.datetime(2000, 1, 1)
    output = read_in.output
    assert (output.fields, output.checkpoint_every, output.compression) == (("eta", "u", "v"), 600.0, True)
    assert output.budgets == "rates"


def test_the_text_of_the_file_is_kept_verbatim(tmp_path: Path) -> None:
    text = FRONT.replace("\n", "\r\n") + "# the end"
    (tmp_path / "front.toml").write_bytes(text.encode())
    read_in = read(tmp_path / "front.toml", {"frame.latitude": "30 deg"})
    assert read_in.text == text
    assert read_in.path == tmp_path / "front.toml"
    assert read_in.with_values({"title": "Another"}).text == text


def test_an_experiment_is_rebuilt_from_its_json(front: Path) -> None:
    for read_in in (read(front), read(front, {"layer.depth": "100 + 1e-4*x", "time.start": "2001-02-03"})):
        text = json.dumps(read_in.as_json())
        rebuilt = Experiment.from_json(json.loads(text))
        assert rebuilt == read_in
        assert hash(rebuilt) == hash(read_in)
        assert json.dumps(rebuilt.as_json()) == text


def test_an_experiment_is_frozen_and_can_be_sent_to_another_process(front: Path) -> None:
    read_in = read(front)
    with pytest.raises(ValidationError, match="frozen"):
        read_in.title = "Another"  # type: ignore[misc]
    sent = pickle.loads(pickle.dumps(read_in))
    assert sent == read_in
    assert sent.text == read_in.text


# ---------------------------------------------------------------------------------------------------- other values


def test_other_values_make_another_experiment_and_leave_the_first(front: Path) -> None:
    first = read(front)
    second = first.with_values({"frame.latitude": "30 deg", "start.0.eta": 0.25, "numerics.threads": 1})
    assert second.frame.latitude == pytest.approx(math.pi / 6, rel=1e-15, abs=0)  # one rounding
    assert second.start[0].eta == 0.25
    assert second.numerics.threads == 1
    assert first == read(front)
    assert second.with_values({"frame.latitude": "45 deg", "start.0.eta": "0.5 * sign(x)"}).numerics.threads == 1


def test_an_experiment_made_without_a_file_takes_other_values_too(front: Path) -> None:
    made = Experiment.from_json(read(front).as_json())
    assert made.with_values({"layer.depth": "50 m"}).layer.depth == 50.0
    assert (made.text, made.path) == ("", None)
    with pytest.raises(RequestError) as raised:
        made.with_values({"layer.depth": "50 s"})
    assert str(raised.value).startswith('with_values: layer.depth: "50 s" is a time; ')


@pytest.mark.parametrize(
    ("key", "text", "where", "value"),
    [
        ("frame.latitude", "-45 deg", "frame", -math.pi / 4),
        ("frame.latitude", '"-45 deg"', "frame", -math.pi / 4),
        ("grid.cells", "[64, 8]", "grid", (64, 8)),
        ("grid.cells.1", "8", "grid", (1024, 8)),
        ("numerics.linear", "false", "numerics", False),
        ("time.start", "2001-02-03", "time", datetime.datetime(2001, 2, 3)),
        ("layer.depth", "H0", None, None),
        ("layer.depth", '{ file = "a.npy" }', "layer", FileVariable(file=Path.cwd() / "a.npy")),
        ("layer.reference_depth", "80", "layer", 80.0),
    ],
)
def test_a_value_set_as_text_is_read_as_toml_and_else_as_the_text(
    front: Path, key: str, text: str, where: str | None, value: Any
) -> None:
    if where is None:
        with pytest.raises(RequestError, match='uses "H0", which is not a known name'):
            read(front, {key: text})
        return
    assert getattr(getattr(read(front, {key: text}), where), key.split(".")[1]) == value


def test_a_text_that_would_add_other_keys_is_taken_as_text(front: Path) -> None:
    assert read(front, {"title": '"a"\n[frame]\nlatitude = 0'}).title == '"a"\n[frame]\nlatitude = 0'


# ----------------------------------------------------------------------------------------------------------- paths


def test_paths_count_from_the_file_and_those_set_from_outside_from_the_current_folder(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    (tmp_path / "here").mkdir()
    (tmp_path / "there").mkdir()
    text = changed(
        ('depth = "100 m"', 'depth = { file = "bank.nc", variable = "depth" }'),
        ("[numerics]", '[[start]]\nkind = "run"\nrun = "../runs/spin-up"\n\n[numerics]'),
        ("[numerics]", '[[start]]\nkind = "file"\nfile = "/data/start.nc"\n\n[numerics]'),
    )
    (tmp_path / "there" / "front.toml").write_text(text)
    monkeypatch.chdir(tmp_path / "here")
    inside = read("../there/front.toml")
    assert inside.layer.depth == FileVariable(file=tmp_path / "there" / "bank.nc", variable="depth")
    assert inside.start[1].run == tmp_path / "runs" / "spin-up"
    assert inside.start[2].file == Path("/data/start.nc")
    assert inside.as_json()["layer"]["depth"]["file"] == str(tmp_path / "there" / "bank.nc")
    outside = read("../there/front.toml", {"layer.depth.file": "other.nc", "start.1.run": "../runs/other"})
    assert outside.layer.depth == FileVariable(file=tmp_path / "here" / "other.nc", variable="depth")
    assert outside.start[1].run == tmp_path / "runs" / "other"
    assert inside.with_values({"start.2.file": "mine.nc"}).start[2].file == tmp_path / "here" / "mine.nc"
    monkeypatch.chdir(tmp_path)
    assert Experiment.from_json(inside.as_json()) == inside


def test_every_path_of_the_settings_has_a_name_by_which_it_is_made_absolute() -> None:
    from swmodel.settings import schema
    from swmodel.settings.document import PATH_KEYS

    def paths(node: Any, name: str) -> set[str]:
        inner = (
            node.items() if isinstance(node, dict) else ((name, one) for one in node) if isinstance(node, list) else ()
        )
        here = (
            {name}
            if isinstance(node, dict) and node.get("format") in ("path", "file-path", "directory-path")
            else set()
        )
        return here.union(*(paths(value, str(key)) for key, value in inner))

    assert paths(schema(), "") == set(PATH_KEYS)


# ----------------------------------------------------------------------------------------------------------- dates


@pytest.mark.parametrize(
    ("text", "date"),
    [
        ("2001-02-03", datetime.datetime(2001, 2, 3)),
        ("2001-02-03T04:05:06", datetime.datetime(2001, 2, 3, 4, 5, 6)),
        ("2001-02-03 04:05:06.5", datetime.datetime(2001, 2, 3, 4, 5, 6, 500_000)),
        ("2001-02-03T04:05:06Z", datetime.datetime(2001, 2, 3, 4, 5, 6)),
        ("2001-02-03T04:05:06+02:00", datetime.datetime(2001, 2, 3, 2, 5, 6)),
    ],
)
def test_the_start_of_time_is_a_date_in_utc(tmp_path: Path, text: str, date: datetime.datetime) -> None:
    read_in = experiment(tmp_path, ('until = "3.6 day"', f'until = "3.6 day"\nstart = {text}'))
    assert read_in.time.start == date
    assert Experiment.from_json(read_in.as_json()) == read_in


# ---------------------------------------------------------------------------------------------------------- faults


def test_settings_made_in_python_must_agree_too(front: Path) -> None:
    first = read(front)
    edges = EdgesSettings(west="periodic", east="wall", south="wall", north="wall")
    with pytest.raises(ValidationError, match='east is "wall", while west is "periodic"'):
        Experiment(layer=first.layer, grid=first.grid, edges=edges, time=first.time, frame=first.frame)


def test_an_error_found_later_is_given_its_place_in_the_file(front: Path) -> None:
    later = RequestError([Fault(("layer", "depth"), "the layer dries"), Fault((), "something else")])
    assert [str(fault) for fault in read(front).placed(later).faults] == [
        f"{front}:10: layer.depth: the layer dries",
        f"{front}: something else",
    ]


JUNK = st.recursive(
    st.one_of(
        st.none(),
        st.booleans(),
        st.integers(),
        st.floats(),
        st.text(max_size=10),
        st.sampled_from(["5 km", "x/a", "wall", "formula", "vortex", 10**400, "deformation_radius", "8 %", [], {}]),
    ),
    lambda inner: st.one_of(
        st.lists(inner, max_size=3),
        st.dictionaries(st.sampled_from(["kind", "file", "run", "theory", "west", "of", "x"]), inner, max_size=3),
    ),
    max_leaves=6,
)


def attempt(make: Callable[[], Experiment]) -> tuple[Experiment | None, list[Fault]]:
    """Return the experiment, or the faults for which it is refused."""
    try:
        return make(), []
    except RequestError as error:
        return None, error.faults


def holders(node: Any) -> list[Any]:
    """Return every table and list within a document."""
    inner = node.values() if isinstance(node, dict) else node if isinstance(node, list) else None
    return [] if inner is None else [node, *(one for value in inner for one in holders(value))]


@settings(deadline=None)  # the machine may be busy
@given(st.data())
def test_whatever_stands_in_a_document_it_is_an_experiment_or_a_list_of_faults(data: st.DataObject) -> None:
    document = copy.deepcopy(tomli.loads(FRONT))
    for _ in range(data.draw(st.integers(1, 3))):
        holder = data.draw(st.sampled_from([one for one in holders(document) if one]))
        key = data.draw(st.sampled_from(sorted(holder) if isinstance(holder, dict) else range(len(holder))))
        change = data.draw(st.sampled_from(["replace", "remove", "rename"]))
        if change == "replace":
            holder[key] = data.draw(JUNK)
        elif change == "remove" or isinstance(holder, list):
            del holder[key]
        else:
            holder[data.draw(st.text(min_size=1, max_size=8))] = holder.pop(key)
    made, faults = attempt(lambda: Experiment.from_json(document))
    if made is None:
        assert faults
        assert all(fault.key and fault.found for fault in faults)
    else:
        assert Experiment.from_json(made.as_json()) == made


@settings(deadline=None)  # the machine may be busy
@given(st.text(max_size=30), st.text(max_size=30))
def test_whatever_is_set_from_outside_it_is_an_experiment_or_a_list_of_faults(key: str, text: str) -> None:
    first = Experiment.from_json(tomli.loads(FRONT))
    for dotted in (key, f"frame.{key}", f"start.0.{key}", "layer.depth", f"layer.depth.{key}"):
        made, faults = attempt(lambda values={dotted: text}: first.with_values(values))
        assert (made is None) == bool(faults)


def test_reading_a_configuration_loads_nothing_heavy(front: Path) -> None:
    code = (
        "import sys; from swmodel.settings import read, schema; read(sys.argv[1]); schema();"
        "print([name for name in ('numba', 'h5py', 'matplotlib', 'pint', 'scipy', 'xarray') if name in sys.modules])"
    )
    root = Path(__file__).parent.parent
    done = subprocess.run(
        [sys.executable, "-c", code, str(front)],
        capture_output=True,
        text=True,
        check=True,
        cwd=root,
    )
    assert done.stdout.strip() == "[]"
