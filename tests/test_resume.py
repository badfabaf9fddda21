"""Runs that stop: by a signal, a kill, a full disk; and how they go on, bit for bit."""

from __future__ import annotations

import json
import os
import shutil
import signal
import subprocess
import sys

import numpy as np
import pytest
from stepped import assert_same_runs, wait_for_parts

import swmodel
from swmodel.cli import main
from swmodel.store.reading import Run


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


@pytest.mark.parametrize("stepper", ["ssprk3", "rk4", "leapfrog"])
def test_resume_after_a_kill_equals_the_uninterrupted_run_bit_for_bit(step, tmp_path, stepper):
    # a checkpoint at every diagnostics time, then SIGKILL: nothing is said, nothing is tidied
    sets = [
        "--set",
        f"time.stepper={stepper}",
        "--set",
        "time.until=20 day",
        "--set",
        "output.every=4 h",
        "--set",
        "output.checkpoint_every=1e-6",
    ]
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


def test_resume_refuses_a_checkpoint_that_another_version_wrote(step, tmp_path, monkeypatch, capsys):
    from swmodel.model import running

    assert main(["run", str(step), "--into", str(tmp_path / "run"), "--set", "time.until=1 day"]) == 0
    monkeypatch.setattr(running, "KEPT_IN_CHECKPOINTS", ("step", "of_the_future"))
    assert main(["resume", str(tmp_path / "run"), "--until", "2 day"]) == 2
    assert "holds no of_the_future: another version of swmodel wrote it" in capsys.readouterr().err


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
