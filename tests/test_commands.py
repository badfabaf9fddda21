"""The commands as a user types them: what they print, what they leave, and their exit codes."""

from __future__ import annotations

import json
import os
import shutil
import signal
import subprocess
import sys
import time
from pathlib import Path

import numpy as np
import pytest

import swmodel
from swmodel.cli import main
from swmodel.errors import CAUTION
from swmodel.store.reading import Run

CONFIGS = Path(__file__).parent.parent / "configs"

# A step in a narrow channel: small, and with the types of configs/front.toml, so that no more is compiled
STEP = """\
title = "A step in the made-up Sarn Channel"
question = "Does the command line do what it says?"

[frame]
latitude = "45 deg"

[layer]
depth = "100 m"
reduced_gravity = "0.02 m/s^2"

[grid]
cells = [64, 4]
size = ["128 km", "8 km"]

[edges]
west = "wall"
east = "wall"
south = "periodic"
north = "periodic"

[[start]]
kind = "step"
amplitude = "0.5 m"

[numerics]
linear = true
threads = 1

[time]
stepper = "ssprk3"
until = "4 day"

[output]
every = "2 h"

[[expect]]
claim = "Water is neither lost nor gained"
measure = { kind = "change", of = "mass" }
value = 0
within = 1e-12
because = "mass is conserved to round-off, some 1e-16 a step"
"""


FREQUENCY = """\
measure = { kind = "frequency", of = "eta", at = ["3 km", "0 km"] }
value = "inertial_frequency"
within = "0.01 %"
"""


@pytest.fixture
def step(tmp_path):
    """A configuration on disk."""
    path = tmp_path / "step.toml"
    path.write_text(STEP)
    return path


def test_run_leaves_a_judged_and_drawn_folder(step, tmp_path, capsys):
    assert main(["run", str(step), "--into", str(tmp_path / "run")]) == 0
    printed = capsys.readouterr()
    assert "overall: holds" in printed.out
    assert CAUTION in " ".join(printed.err.split())
    names = {path.name for path in (tmp_path / "run").iterdir()}
    files = {"config.toml", "settings.json", "snapshots.h5", "diagnostics.h5", "verdict.json", "run.log"}
    assert names >= files | {"checkpoints", "figures"}
    assert (tmp_path / "run" / "config.toml").read_text() == STEP
    assert list((tmp_path / "run" / "figures").glob("*.png"))
    verdict = json.loads((tmp_path / "run" / "verdict.json").read_text())
    assert verdict["overall"] == "holds"
    assert verdict["caution"] == CAUTION
    assert verdict["expectations"][0]["remarks"][0] == "one grid: grid error not included"


def test_a_second_run_gets_a_folder_of_its_own(step, tmp_path, monkeypatch):
    monkeypatch.chdir(tmp_path)
    for _ in range(2):
        assert main(["run", str(step), "--set", "time.until=4 h"]) == 0
    assert sorted(path.name for path in (tmp_path / "runs").iterdir()) == ["step", "step-2"]


def test_run_refuses_a_folder_that_holds_anything(step, tmp_path, capsys):
    (tmp_path / "held").mkdir()
    (tmp_path / "held" / "note.txt").write_text("mine")
    assert main(["run", str(step), "--into", str(tmp_path / "held")]) == 2
    assert "holds note.txt" in capsys.readouterr().err
    assert [path.name for path in (tmp_path / "held").iterdir()] == ["note.txt"]


def test_a_failed_expectation_gives_exit_1(step, tmp_path, capsys):
    step.write_text(STEP.replace("value = 0", "value = 0.5"))
    assert main(["run", str(step), "--into", str(tmp_path / "run")]) == 1
    assert "overall: fails" in capsys.readouterr().out


def test_undecided_counts_as_failed_only_when_strict(step, tmp_path, capsys):
    # the basin slosh and the inertial swing are both there: no single sinusoid is found to a hundredth of a per cent
    assert main(["run", str(step), "--into", str(tmp_path / "run")]) == 0
    other = tmp_path / "other.toml"
    other.write_text(
        STEP.replace(
            'measure = { kind = "change", of = "mass" }\nvalue = 0\nwithin = 1e-12',
            FREQUENCY,
        )
    )
    assert main(["judge", str(tmp_path / "run"), str(other)]) == 0
    assert "undecided" in capsys.readouterr().out
    assert main(["judge", str(tmp_path / "run"), str(other), "--strict"]) == 1


def test_faults_come_all_at_once_with_their_lines_and_nothing_is_written(step, tmp_path, capsys):
    step.write_text(STEP.replace('depth = "100 m"', 'dept = "100 m"').replace('until = "4 day"', 'until = "4 km"'))
    assert main(["run", str(step), "--into", str(tmp_path / "run")]) == 2
    err = capsys.readouterr().err
    assert f"{step}:8: layer.dept" in err
    assert f"{step}:31: time.until" in err
    assert "2 faults; nothing was written" in err
    assert not (tmp_path / "run").exists()


def test_a_layer_that_dries_gives_exit_3_and_keeps_the_last_good_state(step, tmp_path, capsys):
    # a trough 1 m deep in a layer of 1.2 m, whose refilling overshoots (invented): the full equations outcrop
    step.write_text(
        STEP.replace('depth = "100 m"', 'depth = "1.2 m"')
        .replace('amplitude = "0.5 m"', 'amplitude = "1.1 m"')
        .replace("linear = true", "linear = false")
    )
    folder = tmp_path / "run"
    assert main(["run", str(step), "--into", str(folder)]) == 3
    err = capsys.readouterr().err
    assert "likely cause" in err
    assert "x = " in err
    kept = sorted((folder / "checkpoints").glob("*.h5"))
    assert kept
    from swmodel.store.checkpoints import read_checkpoint

    state = read_checkpoint(folder)
    assert all(np.isfinite(field).all() for level in state.levels for field in level)


@pytest.mark.parametrize(("number", "code"), [(signal.SIGTERM, 143), (signal.SIGINT, 130)])
@pytest.mark.parametrize("stepper", ["ssprk3", "rk4", "leapfrog"])
def test_resume_after_a_stop_equals_the_uninterrupted_run_bit_for_bit(step, tmp_path, number, code, stepper):
    sets = ["--set", f"time.stepper={stepper}", "--set", "time.until=20 day", "--set", "output.every=4 h"]
    stopped, whole = tmp_path / "stopped", tmp_path / "whole"
    words = ["run", str(step), "--into", str(stopped), *sets]
    command = [sys.executable, "-c", "import sys; from swmodel.cli import main; sys.exit(main())", *words]
    process = subprocess.Popen(command, stderr=subprocess.PIPE, text=True)
    wait_for_parts(stopped, process)
    process.send_signal(number)
    _, err = process.communicate(timeout=120)
    assert process.returncode == code, err
    assert f"swmodel resume {stopped}" in err
    assert main(["resume", str(stopped)]) == 0
    assert main(["run", str(step), "--into", str(whole), *sets]) == 0
    assert_same_runs(stopped, whole)


def test_resume_after_a_kill_equals_the_uninterrupted_run_bit_for_bit(step, tmp_path):
    # a checkpoint at every diagnostics time, then SIGKILL: nothing is said, nothing is tidied
    sets = ["--set", "time.until=20 day", "--set", "output.every=4 h", "--set", "output.checkpoint_every=1e-6"]
    killed, whole = tmp_path / "killed", tmp_path / "whole"
    command = [
        sys.executable, "-c", "import sys; from swmodel.cli import main; sys.exit(main())",
        "run", str(step), "--into", str(killed), *sets,
    ]  # fmt: skip
    process = subprocess.Popen(command, stderr=subprocess.DEVNULL, stdout=subprocess.DEVNULL)
    wait_for_parts(killed, process)
    process.kill()
    process.wait()
    assert main(["resume", str(killed)]) == 0
    assert main(["run", str(step), "--into", str(whole), *sets]) == 0
    assert_same_runs(killed, whole)


def test_resume_goes_beyond_the_old_end(step, tmp_path, capsys):
    short, whole = tmp_path / "short", tmp_path / "whole"
    assert main(["run", str(step), "--into", str(short), "--set", "time.until=1 day"]) == 0
    assert main(["resume", str(short), "--until", "4 day"]) == 0
    assert main(["run", str(step), "--into", str(whole)]) == 0
    assert_same_runs(short, whole)
    capsys.readouterr()
    assert main(["resume", str(short), "--until", "4.00001 day"]) == 2
    assert "the nearest is" in capsys.readouterr().err


def test_a_run_that_did_not_reach_its_end_is_undecided_where_the_end_was_meant(step, tmp_path):
    short = tmp_path / "short"
    assert main(["run", str(step), "--into", str(short), "--set", "time.until=1 day"]) == 0
    # the same folder, had the run been meant to last longer
    settings = json.loads((short / "settings.json").read_text())
    settings["time"]["until"] = 4 * 86400.0
    (short / "settings.json").write_text(json.dumps(settings))
    verdict = swmodel.judge(short)
    assert verdict.overall == "undecided"
    assert verdict.expectations[0].reason == "the run ended at 1 day of 4 day"


def test_resume_does_not_go_back(step, tmp_path, capsys):
    assert main(["run", str(step), "--into", str(tmp_path / "run"), "--set", "time.until=1 day"]) == 0
    assert main(["resume", str(tmp_path / "run"), "--until", "12 h"]) == 2
    assert "has reached 1 day already" in capsys.readouterr().err
    assert json.loads((tmp_path / "run" / "settings.json").read_text())["time"]["until"] == 86400.0


def test_resume_refuses_another_pv_flux(step, tmp_path):
    experiment = swmodel.read(step).with_values({"time.until": "1 day"})
    swmodel.run(experiment, into=tmp_path / "run")
    from swmodel.dynamics import PV_FLUXES
    from swmodel.model import resume

    with pytest.raises(swmodel.RequestError, match="PV flux is not what the run began with"):
        resume(tmp_path / "run", "2 day", pv_flux=PV_FLUXES["energy"])


def test_resume_from_the_very_start_equals_the_uninterrupted_run(step, tmp_path):
    from swmodel.model import Model, resume
    from swmodel.model.course import Course
    from swmodel.outlook.plan import make_plan
    from swmodel.store.provenance import gather_provenance
    from swmodel.store.writer import RunWriter

    experiment = swmodel.read(step).with_values({"time.until": "6 h"})
    plan = make_plan(experiment)
    provenance = gather_provenance(experiment.text, experiment.as_json(), ["swmodel"])
    begun, whole = tmp_path / "begun", tmp_path / "whole"
    with RunWriter(begun, plan.basin, provenance=provenance, output=plan.output, epoch=experiment.time.start) as writer:
        course = Course(Model(experiment, plan=plan), plan, writer, None)
        course._store(snapshot=True, diagnostics=True)
        course._checkpoint()
    resume(begun)
    swmodel.run(experiment, into=whole)
    assert_same_runs(begun, whole)


def test_a_fault_of_our_own_is_not_taken_for_a_failed_expectation(step, monkeypatch, capsys):
    from swmodel.cli import commands

    def broken(options):
        raise ZeroDivisionError

    monkeypatch.setattr(commands, "check_command", broken)
    assert main(["check", str(step)]) == 4
    assert "a fault of swmodel" in capsys.readouterr().err


def test_a_folder_in_use_gives_exit_4(step, tmp_path, capsys):
    folder = tmp_path / "run"
    command = [
        sys.executable, "-c", "import sys; from swmodel.cli import main; sys.exit(main())",
        "run", str(step), "--into", str(folder), "--set", "time.until=400 day",
    ]  # fmt: skip
    process = subprocess.Popen(command, stderr=subprocess.DEVNULL, stdout=subprocess.DEVNULL)
    try:
        wait_for_parts(folder, process)
        assert main(["resume", str(folder)]) == 4
        assert str(process.pid) in capsys.readouterr().err
        process.send_signal(signal.SIGSTOP)  # it holds the folder, and does nothing
        shutil.copytree(folder, tmp_path / "copy")  # a reader may take all of it meanwhile
        assert Run(tmp_path / "copy").fields.times.size > 0
    finally:
        process.kill()
        process.wait()


@pytest.mark.skipif(os.geteuid() != 0, reason="only the superuser can mount a small file system")
def test_a_full_disk_gives_exit_4_and_leaves_what_was_written_readable(step, tmp_path):
    small = tmp_path / "small"
    small.mkdir()
    if subprocess.run(["mount", "-t", "tmpfs", "-o", "size=700k", "tmpfs", small], check=False).returncode:
        pytest.skip("no file system may be mounted here")
    try:
        # check must not see the shortage: it would refuse the run before anything is written
        code = (
            "import sys, swmodel.outlook.machine as m, swmodel.outlook.cost as c\n"
            "c.free_disk = m.free_disk = lambda folder: None\n"
            "from swmodel.cli import main; sys.exit(main())"
        )
        words = ["run", step, "--into", small / "run", "--set", "output.every=15 min"]
        done = subprocess.run(
            [sys.executable, "-c", code, *map(str, words)], capture_output=True, text=True, timeout=300, check=False
        )
        assert done.returncode == 4, done.stderr
        assert "Traceback" not in done.stderr
        fields = Run(small / "run").fields
        assert fields.times.size > 0
        assert np.isfinite(fields.field("eta", fields.times.size - 1)).all()
        assert not list((small / "run").rglob("*.tmp"))
    finally:
        subprocess.run(["umount", "--lazy", small], check=True)  # the reader above may still hold its file


def test_check_prints_a_table_of_80_columns_and_ends_with_a_count(step, capsys):
    assert main(["check", str(step)]) == 0
    out = capsys.readouterr().out
    assert max(map(len, out.splitlines())) <= 80
    assert out.splitlines()[-1].startswith("0 refusals, ")


def test_check_refuses_a_set_up_that_cannot_answer(step, capsys):
    late = 'measure = { kind = "amplitude", of = "eta", during = "9 day" }\nvalue = "1 m"\nwithin = "1 m"\n'
    step.write_text(f'{STEP}\n[[expect]]\nclaim = "late"\n{late}because = "none"\n')
    assert main(["check", str(step)]) == 2
    assert capsys.readouterr().out.splitlines()[-1].startswith("1 refusal")


def test_machines_get_json(step, tmp_path, capsys):
    assert main(["check", str(step), "--json"]) == 0
    assert json.loads(capsys.readouterr().out)["refusals"] == []
    assert main(["list", "--json"]) == 0
    assert set(json.loads(capsys.readouterr().out)) >= {"bodies", "starts", "theory"}
    assert main(["run", str(step), "--into", str(tmp_path / "run"), "--set", "time.until=4 h"]) == 0
    capsys.readouterr()
    assert main(["judge", str(tmp_path / "run"), "--json"]) == 0
    assert json.loads(capsys.readouterr().out)["overall"] == "holds"


def test_new_writes_a_starting_point_and_never_overwrites(tmp_path, monkeypatch, capsys):
    monkeypatch.chdir(tmp_path)
    assert main(["new", "front"]) == 0
    assert (tmp_path / "front.toml").read_text() == (CONFIGS / "front.toml").read_text()
    (tmp_path / "front.toml").write_text("mine")
    assert main(["new", "front"]) == 2
    assert (tmp_path / "front.toml").read_text() == "mine"
    assert main(["new", "frnt"]) == 2
    assert 'did you mean "front"?' in capsys.readouterr().err


def test_list_fits_80_columns_and_names_every_row(capsys):
    assert main(["list"]) == 0
    out = capsys.readouterr().out
    assert max(map(len, out.splitlines())) <= 80
    for name in (*swmodel.measures.MEASURES, *swmodel.theory.THEORY, *swmodel.state.STARTS, *swmodel.frame.PLANES):
        assert f"  {name} " in out or f"  {name}\n" in out


def test_a_mistyped_command_is_answered_with_the_nearest(capsys):
    with pytest.raises(SystemExit) as stop:
        main(["chekc", "x.toml"])
    assert stop.value.code == 2
    assert 'did you mean "check"?' in capsys.readouterr().err


def test_schema_is_json(capsys):
    assert main(["schema"]) == 0
    assert json.loads(capsys.readouterr().out)["type"] == "object"


def test_python_can_do_what_the_command_line_does(step, tmp_path):
    experiment = swmodel.read(step).with_values({"frame.latitude": "-30 deg", "time.until": "6 h"})
    assert swmodel.check(experiment).refusals == []
    run = swmodel.run(experiment, into=tmp_path / "run")
    assert run.verdict()["overall"] == "holds"
    with run.snapshots() as snapshots:
        assert snapshots["eta"].dims == ("time", "y", "x")
        assert float(snapshots["time"].size) == 4
    model = swmodel.Model(experiment)
    model.advance("6 h")
    # the model by itself and the run on disk are one thing, to the last bit
    assert np.array_equal(model.eta, run.fields.field("eta", -1))


def test_the_experiment_and_the_code_of_the_readme_work(tmp_path, monkeypatch, capsys):
    readme = (CONFIGS.parent / "README.md").read_text()
    monkeypatch.chdir(tmp_path)
    Path("pool.toml").write_text(readme.split("```toml\n")[1].split("```")[0])
    exec(compile(readme.split("```python\n")[1].split("```")[0], "README.md", "exec"), {})
    printed = capsys.readouterr().out
    assert "0 refusals" in printed
    assert printed.rstrip().endswith("holds")


def wait_for_parts(folder, process):
    """Wait until a run has written a few snapshots."""
    for _ in range(6000):  # five minutes: a cold cache compiles first
        if (folder / "snapshots.h5").exists():
            try:
                if Run(folder).fields.times.size > 3:
                    return
            except (OSError, swmodel.SwmodelError):
                pass
        assert process.poll() is None, "the run ended before it could be stopped"
        time.sleep(0.05)
    raise AssertionError("the run wrote nothing for five minutes")


def assert_same_runs(one, other):
    """Every number of two runs is the same, to the last bit."""
    a, b = Run(one), Run(other)
    assert np.array_equal(a.fields.times, b.fields.times)
    for name in ("eta", "u", "v"):
        for k in range(a.fields.times.size):
            assert np.array_equal(a.fields.field(name, k), b.fields.field(name, k)), f"{name} at snapshot {k}"
    assert np.array_equal(a.series.time, b.series.time)
    for name in a.series.names:
        assert np.array_equal(a.series[name], b.series[name], equal_nan=True), name
    for name, values in a.series.group("energy_budget").items():
        assert np.array_equal(values, b.series.group("energy_budget")[name]), name
