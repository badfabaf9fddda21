"""What a run costs: memory and disk against what is really taken, time against what was measured."""

from __future__ import annotations

import json
import math
import tracemalloc
from pathlib import Path
from typing import Any

import numpy as np
import pytest
from prospects import experiment, outlook

import swmodel
from swmodel.outlook import cost, machine, make_plan, measure_speed, remember_run, speeds
from swmodel.outlook.cost import memory_needed, reckon
from swmodel.outlook.speeds import Kernel, Past, Speeds, read_speeds

KERNEL = Kernel("ssprk3", "both", "double", True, True, True, 2)


@pytest.fixture
def cache(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Path:
    """Return a cache folder of its own for measured speeds; compiled kernels stay where they are."""
    monkeypatch.setattr(speeds, "cache_folder", lambda: tmp_path)
    return tmp_path


def kept(cache: Path, steps: dict[str, dict[str, float]], runs: list[dict[str, float]]) -> None:
    held = {"format": 1, "machines": {machine.machine_name(): {"steps": steps, "runs": runs}}}
    (cache / speeds.FILE).write_text(json.dumps(held))


# -------------------------------------------------------------------------------------------------- memory and disk


@pytest.mark.parametrize(
    "start",
    [
        {"kind": "formula", "eta": "0.5 * sign(x)"},
        {"kind": "vortex", "profile": "shielded", "speed": 0.02, "radius": 3e4},
        {"kind": "bump", "amplitude": 0.5, "radius": 3e4, "balance": "gradient"},
    ],
    ids=lambda start: start["kind"],
)
def test_planning_takes_no_more_memory_than_said(start: dict[str, Any]) -> None:
    given = experiment(
        {"grid.cells": [300, 300], "grid.size": [6e5, 6e5], "start": [start], "numerics.linear": False, "expect": []}
    )
    make_plan(given)  # what is loaded once does not count
    tracemalloc.start()
    make_plan(given)
    peak = tracemalloc.get_traced_memory()[1]
    tracemalloc.stop()
    said = cost.PLANNING_DOUBLES + cost.BALANCE_DOUBLES * cost.is_balanced(given.start)
    # and the figure is no mere guess: less than half of it is never needed
    assert 0.4 * said * 8 * 300 * 300 < peak < said * 8 * 300 * 300


def test_finding_the_largest_frequency_by_iteration_is_counted(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(cost, "COMPILED_BYTES", 0.0)  # which outweighs all else on so small a grid
    # cells of 20 km at f = 1e-4 and c = 1.4 m/s are coarse
    walls = dict.fromkeys(("edges.south", "edges.north"), "wall")
    values = {"grid.cells": [200, 200], "grid.size": [4e6, 4e6], "frame.plane": "beta", "output": {}, "expect": []}
    said = outlook({**values, **walls})
    assert said.cost is not None
    grid = experiment(values).grid
    assert said.cost.memory == memory_needed(grid, "ssprk3", balanced=False, iterated=True)
    assert said.cost.memory > memory_needed(grid, "ssprk3", balanced=False)


def test_memory_grows_with_cells_levels_and_precision() -> None:
    def needed(stepper: str = "ssprk3", *, balanced: bool = False, **keys: Any) -> float:
        values = {"grid.cells": [2048, 2048], **{f"grid.{key}": value for key, value in keys.items()}}
        return memory_needed(experiment(values).grid, stepper, balanced=balanced)

    assert needed("leapfrog") > needed() > needed(precision="single")
    assert needed(balanced=True) > needed()
    # all but what libraries and the compiler take
    assert needed(cells=[4096, 2048]) > 1.7 * needed()


def test_the_disk_taken_lies_between_the_least_and_the_most_said(tmp_path: Path) -> None:
    # random velocities do not compress, level ones do: the least holds only for a flow that fills the domain
    values = {
        "grid.cells": [96, 32],
        "grid.size": [96e3, 32e3],
        "start": [{"kind": "formula", "eta": "0.1 * sin(x / 5e3) * cos(y / 7e3)"}],
        "time.until": "2 h",
        "output": {"every": "6 min"},
        "expect": [],
    }
    given = experiment({**values, "numerics.threads": 1})
    said = swmodel.check(given)
    assert said.cost is not None
    folder = swmodel.run(given, into=tmp_path / "run", outlook=said).folder
    taken = sum(path.stat().st_size for path in folder.rglob("*") if path.is_file())
    checkpoints = sum(path.stat().st_size for path in (folder / "checkpoints").iterdir())
    assert taken <= said.cost.disk
    # one checkpoint was written of three that may lie there at once
    assert taken >= said.cost.disk_least - 2 * checkpoints


def test_what_is_free_is_asked_where_the_run_would_be_written(tmp_path: Path) -> None:
    free = machine.free_disk(tmp_path / "not" / "there" / "yet")
    assert free is not None
    assert free > 0


def test_the_memory_available_is_what_the_system_says(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    info = tmp_path / "meminfo"
    info.write_text("MemTotal:       16000000 kB\nMemAvailable:    8000000 kB\n")
    monkeypatch.setattr(machine, "MEMINFO", info)
    monkeypatch.setattr(machine, "CONTROL_GROUP", tmp_path)
    assert machine.available_memory() == 8e6 * 1024
    # a container with less has less
    (tmp_path / "memory.max").write_text("3000000000\n")
    (tmp_path / "memory.current").write_text("1000000000\n")
    assert machine.available_memory() == 2e9
    (tmp_path / "memory.max").write_text("max\n")
    assert machine.available_memory() == 8e6 * 1024
    info.unlink()
    assert (machine.available_memory() or 0) > 0


def test_output_that_may_fit_once_compressed_is_not_refused(monkeypatch: pytest.MonkeyPatch) -> None:
    plan = make_plan(experiment())
    plain = reckon(plan, Path()).disk
    monkeypatch.setattr(cost, "free_disk", lambda folder: 0.4 * plain)
    assert reckon(plan, Path()).faults() == []
    monkeypatch.setattr(cost, "free_disk", lambda folder: 0.2 * plain)
    (fault,) = reckon(plan, Path()).faults()
    assert fault.key == ("output",)


# ------------------------------------------------------------------------------------------------------------ wall time


def test_a_machine_that_never_ran_says_so(cache: Path) -> None:
    said = outlook()
    assert said.cost is not None
    assert said.cost.seconds is None
    assert not said.cost.compiled
    assert "not yet measured on this machine: the first run measures it" in " ".join(str(said).split())


@pytest.mark.parametrize(
    "text", ["", "[]", '{"format": 1}', '{"format": 1, "machines": {"here": {"steps": 3}}}', "\x00"]
)
def test_a_file_that_is_no_record_of_speeds_is_taken_for_none(cache: Path, text: str) -> None:
    (cache / speeds.FILE).write_text(text.replace("here", machine.machine_name()))
    assert read_speeds() == Speeds({}, ())
    speeds.remember(2.0, 1.0)
    assert read_speeds().past == (Past(2.0, 1.0),)


def test_another_machines_speeds_are_not_taken_for_this_ones(cache: Path) -> None:
    held = {"format": 1, "machines": {"other": {"steps": {KERNEL.key: {"4096": 1e-4}}}}}
    (cache / speeds.FILE).write_text(json.dumps(held))
    assert read_speeds().measured == {}
    speeds.remember(2.0, 1.0)
    assert json.loads((cache / speeds.FILE).read_text())["machines"]["other"] == held["machines"]["other"]


def test_time_is_reckoned_from_steps_that_were_timed(cache: Path) -> None:
    known = Speeds({KERNEL: {4096: 4e-5, 65536: 6.4e-4}}, ())
    assert known.step(KERNEL, 4096) == (4e-5, KERNEL)
    # between two sizes with equal time a cell it is that time a cell
    assert known.step(KERNEL, 16384)[0] == pytest.approx(1.6e-4)  # type: ignore[index]
    # smaller grids cost their calls, larger ones their cells
    assert known.step(KERNEL, 16)[0] == 4e-5  # type: ignore[index]
    assert known.step(KERNEL, 655360)[0] == pytest.approx(6.4e-3)  # type: ignore[index]
    kept(cache, {KERNEL.key: {"4096": 4e-5}}, [])
    said = outlook({"numerics.threads": 2})
    assert said.cost is not None
    work = said.cost.work
    assert (work.cells, work.steps, work.snapshots, work.diagnostics) == (4096, 2160, 88, 88)
    # eta 4 x 1024, u 4 x 1025, v 5 x 1024
    assert work.values == 4 * 1024 + 4 * 1025 + 5 * 1024
    if said.cost.work.kernel == KERNEL:  # a machine of one core names another
        stepping = 4e-5 * (2160 + cost.STEPS_A_DIAGNOSTIC * 88)
        storing = 88 * (work.values * cost.SECONDS_A_VALUE + cost.SECONDS_A_SNAPSHOT)
        assert said.cost.seconds == pytest.approx(cost.START_SECONDS + stepping + storing)
        assert said.cost.seconds_note == "from steps timed on this machine; no run here to compare with yet"


def test_other_kernels_serve_until_their_own_were_timed() -> None:
    single = Kernel("rk4", "both", "single", True, True, True, 2)
    far = Kernel("ssprk3", "energy", "double", False, False, False, 1)
    known = Speeds({KERNEL: {4096: 1e-4}, far: {4096: 1.0}}, ())
    step, used = known.step(single, 4096)  # type: ignore[misc]
    assert used == KERNEL
    assert step == pytest.approx(1e-4 * 1.43 * 0.57)


def test_a_kernels_name_reads_back() -> None:
    for kernel in (KERNEL, Kernel("leapfrog", "Own", "single", False, False, False, 16)):
        assert Kernel.from_key(kernel.key) == kernel


def test_past_runs_correct_the_estimate_and_say_how_good_it_is(cache: Path) -> None:
    runs = [{"seconds": ratio * 3.0, "reckoned": 3.0} for ratio in (1.5, 2.0, 3.0)]
    key = outlook().cost.work.kernel.key  # type: ignore[union-attr]
    kept(cache, {key: {"4096": 4e-5}}, runs)
    corrected = outlook().cost
    kept(cache, {key: {"4096": 4e-5}}, [])
    plain = outlook().cost
    assert corrected is not None
    assert plain is not None
    # the median run took twice as long; the others 0.75 and 1.5 times that
    assert corrected.seconds == pytest.approx(2 * plain.seconds)  # type: ignore[operator]
    assert corrected.seconds_note.endswith("3 past runs here took 0.75 to 1.5 times such an estimate")


def test_a_run_is_remembered_with_what_was_reckoned_for_its_steps(cache: Path) -> None:
    key = outlook().cost.work.kernel.key  # type: ignore[union-attr]
    kept(cache, {key: {"4096": 4e-5}}, [])
    known = outlook().cost
    assert known is not None
    remember_run(known, 7.0, known.work.cells * known.work.steps)
    assert read_speeds().past == (Past(7.0, known.seconds),)  # type: ignore[arg-type]
    # one that was stopped half way is compared with half of it, the start-up apart
    remember_run(known, 4.0, known.work.cells * known.work.steps / 2)
    half = cost.START_SECONDS + (known.seconds - cost.START_SECONDS) / 2  # type: ignore[operator]
    assert read_speeds().past[1].reckoned == pytest.approx(half)


def test_a_run_that_compiled_its_kernels_says_nothing_of_the_next(cache: Path) -> None:
    unknown = outlook().cost
    assert unknown is not None
    remember_run(unknown, 20.0, 1e6)
    assert read_speeds().past == ()


def test_runs_nearest_in_length_are_compared() -> None:
    long = [Past(100.0 * k, 100.0) for k in range(1, 11)]
    short = [Past(0.5, 1.0)] * 10
    assert Speeds({}, (*long, *short)).ratios(2.0) == [0.5] * 10


def test_only_so_many_runs_are_kept(cache: Path) -> None:
    kept(cache, {}, [{"seconds": 1.0, "reckoned": 1.0}] * speeds.KEPT)
    speeds.remember(2.0, 1.0)
    past = read_speeds().past
    assert len(past) == speeds.KEPT
    assert past[-1] == Past(2.0, 1.0)


def test_a_folder_that_cannot_be_written_spoils_no_run(monkeypatch: pytest.MonkeyPatch, tmp_path: Path) -> None:
    monkeypatch.setattr(speeds, "cache_folder", lambda: tmp_path / "missing")
    speeds.remember(2.0, 1.0)
    assert read_speeds().past == ()


def test_the_benchmark_times_steps_of_the_runs_own_kernels_once(cache: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(speeds, "SECONDS_A_SIDE", 0.005)
    monkeypatch.setattr(speeds, "SIDES", (16, 256))
    model = swmodel.Model(experiment({"numerics.threads": 1}))
    before = model.state.sets.copy()
    measure_speed(model.equations, model.settings)
    known = read_speeds()
    (kernel,) = known.measured
    assert kernel == outlook({"numerics.threads": 1}).cost.work.kernel  # type: ignore[union-attr]
    small, large = known.measured[kernel][256], known.measured[kernel][65536]
    # 256 times the cells: more than the 16-fold that calls alone would leave, and no thousandfold
    assert 16 < large / small < 1000
    assert np.array_equal(model.state.sets, before)
    monkeypatch.setattr(speeds, "_seconds_a_step", lambda *given: math.nan)
    measure_speed(model.equations, model.settings)
    assert read_speeds() == known
