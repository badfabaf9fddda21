"""What `check` prints and refuses."""

from __future__ import annotations

import io
import json
import subprocess
import sys
from pathlib import Path
from typing import Any

import numpy as np
import pytest
from configurations import FRONT, changed
from prospects import outlook

from swmodel.errors import CAUTION
from swmodel.outlook import check, machine
from swmodel.settings import read

CONFIGS = sorted((Path(__file__).parent.parent / "configs").glob("*.toml"))


def refused(values: dict[str, Any]) -> list[str]:
    """Return what is refused; nothing may then be run, and the exit code is 2."""
    said = outlook(values)
    assert said.exit_code == 2
    assert said.plan is None
    assert str(said).endswith(f"\n{len(said.refusals)} refusals, {len(said.cautions)} cautions")
    return [str(fault).removeprefix("with_values: ") for fault in said.refusals]


# --------------------------------------------------------------------------------------------------------- what it says


def test_a_clean_set_up_ends_with_no_refusal_and_no_caution() -> None:
    said = outlook()
    assert str(said).splitlines()[-1] == "0 refusals, 0 cautions"
    assert said.exit_code == 0
    assert said.plan is not None


def test_cautions_alone_do_not_refuse() -> None:
    said = outlook({"time.until": "6 day"})
    assert str(said).splitlines()[-1] == "0 refusals, 1 cautions"
    assert said.exit_code == 0


def test_the_question_comes_first_and_the_tables_in_order() -> None:
    lines = str(outlook({"time.until": "6 day"})).splitlines()
    assert lines[0] == "How wide is what stays of a step in a thin light layer?"
    heads = ["Frame", "Scales", "Resolution", "Step", "Cost", "Expectations", "Cautions"]
    assert [line for line in lines if line in heads] == heads
    assert lines[lines.index("Cautions") + 1].startswith("1. fast waves are back before the end;")


def test_it_says_that_it_is_no_forecast() -> None:
    assert CAUTION in " ".join(str(outlook()).split())


def test_the_scales_of_the_front_are_those_of_the_text_books() -> None:
    text = str(outlook())
    # c = sqrt(0.02 100) m/s; f at 45 deg; a = c/f; 2 pi/f (Gill 1982), worked out by hand
    for name, value in (
        ("wave speed", "1.41 m/s"),
        ("f0", "0.000103 rad/s"),
        ("deformation radius", "13.7 km"),
        ("inertial period", "16.9 h"),
        ("cells per deformation radius x", "25.5"),
    ):
        assert any(line.startswith(name) and value in line for line in text.splitlines()), name


def test_each_expectation_is_shown_with_its_expected_value() -> None:
    said = outlook()
    assert "1. What stays is one deformation radius wide\n   expected 13.71 km within 8 % (1.1 km)\n" in str(said)
    assert [one.theory for one in said.expected if one] == ["deformation_radius"]


@pytest.mark.parametrize("path", CONFIGS, ids=lambda path: path.stem)
def test_the_outlook_keeps_to_80_columns_of_plain_text(path: Path) -> None:
    text = str(check(read(path)))
    assert max(map(len, text.splitlines())) <= 80
    assert text.isprintable() or set(text) - set(filter(str.isprintable, text)) == {"\n"}


def test_refusals_and_cautions_keep_to_80_columns_too() -> None:
    values = {"grid.cells": [40, 40], "start.0.eta": "200 * sign(x)", "time.until": "300 day"}
    said = outlook({**values, "expect.0.measure.to": 1e9})
    assert len(said.refusals) == 2
    assert len(said.cautions) > 2
    assert max(map(len, str(said).splitlines())) <= 80


def test_rich_adds_nothing_but_colour() -> None:
    from rich.console import Console

    said = outlook({"time.until": "6 day"})
    console = Console(width=80, record=True, force_terminal=False, file=io.StringIO())
    console.print(said)
    assert console.export_text().rstrip() == str(said)


def test_the_json_holds_the_same_in_si() -> None:
    said = outlook({"time.until": "6 day"})
    held = json.loads(json.dumps(said.as_json(), allow_nan=False))
    assert held["scales"]["wave_speed"] == {"value": 2**0.5, "unit": "m/s", "note": "c = sqrt(g H)"}
    assert held["expectations"][0]["expected"]["theory"] == "deformation_radius"
    assert [set(one) for one in held["cautions"]] == [{"what", "why", "remedy"}]
    assert held["refusals"] == []
    assert held["caution"] == CAUTION


def test_nothing_infinite_or_unknown_spoils_the_json(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(machine, "_limits", lambda: iter(()))
    said = outlook({"frame": {"plane": "none"}, "expect": [], "start": [{"kind": "rest"}]})
    assert "not known" in str(said)
    json.dumps(said.as_json(), allow_nan=False)


def test_check_loads_no_compiler_and_no_plotting(tmp_path: Path) -> None:
    file = tmp_path / "front.toml"
    file.write_text(FRONT)
    code = (
        "import sys, swmodel; print(swmodel.check(swmodel.read(sys.argv[1]))); "
        "print(sorted({'numba', 'matplotlib', 'h5py', 'llvmlite'} & set(sys.modules)))"
    )
    done = subprocess.run([sys.executable, "-c", code, str(file)], capture_output=True, text=True, check=True)
    assert done.stdout.splitlines()[-2:] == ["0 refusals, 0 cautions", "[]"]


def test_a_start_of_your_own_is_checked_as_well() -> None:
    class Own:
        def fields(self, basin: Any) -> Any:
            grid = basin.grid
            eta = np.full(grid.shape("centre"), 30.0)
            return np.zeros(grid.shape("u")), np.zeros(grid.shape("v")), eta

    said = outlook(start=Own())
    assert any(caution.what.startswith("the elevation is not small") for caution in said.cautions)
    assert any(caution.what == "nothing will move" for caution in said.cautions)


# ------------------------------------------------------------------------------------------------------ what it refuses


def test_a_layer_that_is_dry_at_the_start_is_refused() -> None:
    (fault,) = refused({"start.0.eta": "100 * sign(x)", "expect": []})
    # the first cell centre of the 550 km: -275 km + 268.55 m
    assert fault.startswith("start: the thickness at the start is 0 m at x = -274731 m, y = -805.664 m;")
    assert "no wetting and drying" in fault


def test_a_window_outside_the_run_is_refused() -> None:
    (fault,) = refused({"time.until": "3 day"})
    assert fault.startswith("expect.0.measure.during: 3.6 day lies outside the run; times from 0 s to 3 day")


def test_a_place_outside_the_domain_is_refused() -> None:
    (fault,) = refused({"expect.0.measure.to": "300 km"})
    assert fault.startswith("expect.0.measure.to: x = 300 km lies outside what is stored; x from -275 km to 275 km")


def test_a_place_outside_the_stored_region_is_refused() -> None:
    (fault,) = refused({"output.region": [-1e5, 5e4, -1074.21875, 1074.21875]})
    assert fault.startswith("expect.0.measure.to: x = 70 km lies outside what is stored")


def test_too_few_snapshots_a_period_are_refused() -> None:
    # two inertial periods of 16.9 h, stored every 6 h: 2.8 a period (uncertainty: fewer than 4 alias)
    measure = {"kind": "frequency", "of": "velocity", "at": [0.0, 0.0]}
    values = {"expect.0.measure": measure, "expect.0.value": "inertial_turning", "output": {"every": "6 h"}}
    assert any("2.8" in fault and "4" in fault for fault in refused(values))


def test_a_step_above_the_limit_is_refused() -> None:
    # the limit sqrt(3)/omega_max with omega_max = 2 sqrt(2) c/dx (Durran 2010; Arakawa & Lamb 1977)
    largest = 3**0.5 / (2 * 2**0.5 * 2**0.5 / (550e3 / 1024))
    (fault,) = refused({"time.step": 240.0})
    assert fault.startswith(f"time.step: 240 s is above the stability limit of {largest:.4g} s;")


def test_intervals_with_no_common_step_are_refused() -> None:
    (fault,) = refused({"output.every": 3601.0})
    assert fault.startswith("time.step: the times")
    assert "3601" in fault


def test_everything_is_refused_at_once_and_in_place(tmp_path: Path) -> None:
    file = tmp_path / "front.toml"
    wrong = changed(("0.5 * sign(x)", "100 * sign(x)"), ('to = "70 km"', 'to = "700 km"'), ('"1 h"', '"3601 s"'))
    file.write_text(wrong)
    lines = wrong.splitlines()
    said = check(read(file))
    places = {str(fault.key[0]): fault.line for fault in said.refusals}
    assert places == {
        "start": lines.index("[[start]]") + 1,
        "time": lines.index("[time]") + 1,
        "expect": next(n for n, line in enumerate(lines, 1) if line.startswith("measure")),
    }
    assert all(fault.file == str(file) for fault in said.refusals)
    # what could be computed is shown
    assert "deformation radius" in str(said)
    assert "expected 13.71 km" in str(said)
    assert "\nStep\n" not in str(said)


def test_a_grid_that_fits_in_no_memory_is_refused_before_it_is_made() -> None:
    (fault,) = refused({"grid.cells": [10_000_000, 10_000_000]})
    # 1e14 cells, each of which takes more than the nine doubles of u, v and eta in two levels and a copy
    size = float(fault.removeprefix("grid.cells: the run takes ").split(" TB of memory; ")[0])
    assert size > 1e14 * 9 * 8 / 1e12
    assert fault.endswith("are available; fewer cells")


def test_memory_that_is_not_there_is_refused(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr("swmodel.outlook.outlook.available_memory", lambda: 1e8)
    (fault,) = refused({})
    assert "100 MB are available" in fault


def test_output_that_no_disk_holds_is_refused(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr("swmodel.outlook.cost.free_disk", lambda folder: 1e6)
    (fault,) = refused({})
    assert fault.startswith("output: the output takes ")
    assert "1 MB are free" in fault


def test_more_times_than_can_be_listed_are_refused_for_the_disk() -> None:
    # 3.6e12 snapshots of 4 kB and more
    values = {
        "grid.cells": [4, 4],
        "grid.size": [1e6, 1e6],
        "time.until": 3.6e15,
        "time.step": 1000.0,
        "output": {"every": 1000.0},
    }
    assert any(fault.startswith("output: the output takes") for fault in refused(values))


def test_a_wrong_region_is_refused_with_what_else_is_known() -> None:
    (fault,) = refused({"output.region": [0.0, 1e9, -1000.0, 1000.0]})
    assert fault.startswith("output.region: ")


def test_an_expected_value_that_is_none_is_refused() -> None:
    said = outlook({"frame": {"plane": "none"}})
    assert said.exit_code == 2
    assert said.expected == [None]
    assert "no expected value: see the refusals" in str(said)


def test_a_basin_that_cannot_be_made_leaves_its_refusal_alone() -> None:
    said = outlook({"layer.depth": "100 - abs(x)"})
    assert said.exit_code == 2
    assert said.tables == ()
    assert str(said).endswith("1 refusals, 0 cautions")
