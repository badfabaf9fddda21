"""Checkpoints, going on from them, and who may write into a folder."""

import errno
import json
import math
import os
import re
import subprocess
import sys
from pathlib import Path

import h5py
import numpy as np
import pytest
import store_trial as trial

from swmodel.errors import CAUTION, MachineError, RequestError
from swmodel.store import lock
from swmodel.store.checkpoints import Checkpoint, read_checkpoint, write_checkpoint
from swmodel.store.provenance import Provenance
from swmodel.store.reading import Run
from swmodel.store.series import SeriesWriter
from swmodel.store.writer import free_folder

GRID = trial.make_basin().grid
NO_PROVENANCE = Provenance("", {})


def write(folder, count, **settings):
    with trial.open_writer(folder, **settings) as writer:
        trial.write_run(writer, GRID, count)


def stop_after(folder, count, later=0):
    """Write some snapshots, a checkpoint with the last, and some more, and stop without an orderly end."""
    with trial.open_writer(folder) as writer:
        for k in range(count + later):
            writer.write_diagnostics(k * trial.STEP, {"mass": float(k)}, {"energy_budget": {"pressure": k / 7}})
            writer.write_snapshot(k * trial.STEP, trial.snapshot(GRID, k))
            if k == count - 1:
                writer.write_checkpoint(trial.checkpoint(GRID, k))


@pytest.mark.parametrize("precision", [np.float64, np.float32])
def test_a_checkpoint_comes_back_to_the_last_bit(tmp_path, precision):
    rng = np.random.default_rng(3)
    inside = rng.standard_normal((9, 12)).astype(precision)[2:-2, 3:-3]  # a view, as the state gives it
    special = np.array(
        [[0.0, -0.0, np.nextafter(precision(1), precision(2)), np.finfo(precision).tiny / 4, math.pi]], precision
    )
    levels = [(inside, special, inside.T), (special, inside, inside)]
    extra = {"energy": 0.1 + 0.2, "count": 7, "terms": rng.standard_normal(4), "state": np.arange(3, dtype=np.uint64)}
    write_checkpoint(tmp_path, Checkpoint(0.1 + 0.2, 12345678901, 1 / 3, levels, extra), NO_PROVENANCE)
    back = read_checkpoint(tmp_path)
    assert (back.time, back.steps, back.dt) == (0.1 + 0.2, 12345678901, 1 / 3)
    for level, read in zip(levels, back.levels, strict=True):
        for values, got in zip(level, read, strict=True):
            assert got.dtype == precision
            assert got.tobytes() == values.tobytes()
    assert back.extra["energy"] == 0.1 + 0.2
    assert back.extra["count"] == 7
    np.testing.assert_array_equal(back.extra["terms"], extra["terms"])
    assert back.extra["state"].dtype == np.uint64


def test_the_two_newest_checkpoints_are_kept(tmp_path):
    for k in (1, 9, 10, 100):
        write_checkpoint(tmp_path, trial.checkpoint(GRID, k), NO_PROVENANCE)
    kept = sorted(path.name for path in (tmp_path / "checkpoints").iterdir())
    assert kept == ["checkpoint-000000000010.h5", "checkpoint-000000000100.h5"]


@pytest.mark.parametrize("damage", ["cut short", "one bit", "not ours", "empty"])
def test_a_damaged_checkpoint_is_passed_over_for_the_one_before(tmp_path, damage):
    stop_after(tmp_path / "run", 4)
    with trial.open_writer(tmp_path / "run", resume=True) as writer:
        newest = write_checkpoint(tmp_path / "run", trial.checkpoint(GRID, 5), trial.make_provenance())
    data = newest.read_bytes()
    if damage == "one bit":
        place = data.index(trial.checkpoint(GRID, 5).levels[0][2].tobytes()) + 11
        data = data[:place] + bytes([data[place] ^ 4]) + data[place + 1 :]
    newest.write_bytes({"cut short": data[:-100], "one bit": data, "not ours": b"x" * 5000, "empty": b""}[damage])
    assert read_checkpoint(tmp_path / "run").steps == 3
    with trial.open_writer(tmp_path / "run", resume=True) as writer:
        assert writer.checkpoint.steps == 3
    assert not newest.exists()
    assert f"checkpoint {newest.name} is passed over" in (tmp_path / "run" / "run.log").read_text()


def test_a_checkpoint_takes_numbers_only(tmp_path):
    for value in (True, 1j, np.float16(1.0), "text"):
        with pytest.raises(ValueError, match="numbers of 4 or 8 bytes"):
            write_checkpoint(tmp_path, Checkpoint(0.0, 0, 1.0, [], {"x": value}), NO_PROVENANCE)
    assert list((tmp_path / "checkpoints").iterdir()) == []


def test_a_checkpoint_finds_the_rows_before_it_on_the_disk(tmp_path):
    with trial.open_writer(tmp_path / "run") as writer:
        writer.write_diagnostics(0.0, {"mass": 1.0})
        writer.write_checkpoint(trial.checkpoint(GRID, 0))
        np.testing.assert_array_equal(Run(tmp_path / "run").series["mass"], [1.0])


def test_a_resumed_run_leaves_what_an_unbroken_one_does(tmp_path):
    write(tmp_path / "unbroken", 8)
    stop_after(tmp_path / "broken", 4, later=2)
    assert len(Run(tmp_path / "broken").fields) == 6
    write(tmp_path / "broken", 8, resume=True)
    for folder in ("unbroken", "broken"):
        assert trial.faults_of(tmp_path / folder, GRID, 8, 3) == []
    names = [{path.name for path in (tmp_path / folder).iterdir()} for folder in ("unbroken", "broken")]
    assert names[0] == names[1]


def test_what_is_later_than_the_checkpoint_is_dropped_with_a_message(tmp_path):
    stop_after(tmp_path / "run", 4, later=2)
    half = tmp_path / "run" / "parts" / "snapshots-00000006-00000001.h5.4711.partial"
    half.write_bytes(b"\x89HDF")
    with trial.open_writer(tmp_path / "run", resume=True) as writer:
        assert writer.checkpoint.time == 3 * trial.STEP
        assert len(Run(tmp_path / "run").fields) == 4
        writer.write_snapshot(4 * trial.STEP, trial.snapshot(GRID, 4))
    log = (tmp_path / "run" / "run.log").read_text()
    assert f"dropped {half.name}, which was half written" in log
    assert (
        "dropped 2 snapshots and 2 rows of diagnostics later than the checkpoint at 180 s; the run writes them again"
        in log
    )
    run = Run(tmp_path / "run")
    np.testing.assert_array_equal(run.fields.times, trial.STEP * np.arange(5))
    np.testing.assert_array_equal(run.series["mass"], np.arange(4))


@pytest.mark.parametrize("hard_links", [True, False])
def test_a_run_that_had_ended_can_go_on(tmp_path, monkeypatch, hard_links):
    def refuse(*words):
        raise OSError(errno.EPERM, "no hard links here")

    write(tmp_path / "run", 7)
    if not hard_links:
        monkeypatch.setattr(os, "link", refuse)
    assert not (tmp_path / "run" / "parts").exists()
    write(tmp_path / "run", 12, resume=True, provenance=trial.make_provenance(time={"until": 7200.0}))
    assert trial.faults_of(tmp_path / "run", GRID, 12, 4) == []
    assert json.loads((tmp_path / "run" / "settings.json").read_text())["time"] == {"until": 7200.0}


def test_a_run_without_a_checkpoint_cannot_go_on(tmp_path):
    with trial.open_writer(tmp_path / "run") as writer:
        writer.write_snapshot(0.0, trial.snapshot(GRID, 0))
    with pytest.raises(RequestError, match="holds no whole checkpoint to go on from; run it again from the start"):
        trial.open_writer(tmp_path / "run", resume=True)


def test_a_part_lost_before_the_checkpoint_stops_a_resumption(tmp_path):
    stop_after(tmp_path / "run", 4)
    (tmp_path / "run" / "parts" / "snapshots-00000002-00000001.h5").unlink()
    with pytest.raises(MachineError, match="lacks the part that begins with snapshot 2"):
        trial.open_writer(tmp_path / "run", resume=True)
    assert len(list((tmp_path / "run" / "parts").glob("snapshots-*"))) == 3


def test_a_new_run_into_a_folder_that_holds_anything_is_refused_and_writes_nothing(tmp_path):
    (tmp_path / "letter.txt").write_text("mine")
    with pytest.raises(RequestError) as caught:
        trial.open_writer(tmp_path)
    assert str(caught.value) == (
        f"{tmp_path} holds letter.txt; a folder that is new or empty; name another with --into"
    )
    assert [path.name for path in tmp_path.iterdir()] == ["letter.txt"]


def test_a_folder_that_is_not_a_runs_is_refused(tmp_path):
    (tmp_path / "snapshots.h5").write_bytes(b"")
    for call in (lambda: trial.open_writer(tmp_path, resume=True), lambda: Run(tmp_path)):
        with pytest.raises(
            RequestError, match=re.escape(f"{tmp_path} is not a run's folder: it holds no settings.json")
        ):
            call()
    (tmp_path / "file").write_text("")
    with pytest.raises(RequestError, match="file is not a folder"):
        trial.open_writer(tmp_path / "file")
    assert sorted(path.name for path in tmp_path.iterdir()) == ["file", "snapshots.h5"]


def test_a_run_of_another_experiment_is_refused_with_every_difference(tmp_path):
    stop_after(tmp_path / "run", 2)
    other = trial.make_provenance(frame={"latitude": 0.5}, layer={"depth": 3.0}, time={"until": 1.0})
    with pytest.raises(RequestError) as caught:
        trial.open_writer(tmp_path / "run", resume=True, provenance=other)
    assert str(caught.value).splitlines() == [
        f"frame.latitude: 0.5 is asked for; the run's folder has {math.pi / 4}; start a new run",
        "layer.depth: 3.0 is asked for; the run's folder has nothing; start a new run",
    ]


@pytest.mark.parametrize("name", ["snapshots.h5", "diagnostics.h5"])
def test_files_of_another_experiment_are_refused(tmp_path, name):
    for folder, provenance in (("a", None), ("b", trial.make_provenance(title="another"))):
        write(tmp_path / folder, 4, provenance=provenance)
    (tmp_path / "a" / name).write_bytes((tmp_path / "b" / name).read_bytes())
    with pytest.raises(RequestError, match=f"{name} belongs to another experiment"):
        trial.open_writer(tmp_path / "a", resume=True)


def test_a_second_run_into_a_folder_is_told_who_holds_it_and_since_when(tmp_path):
    with trial.open_writer(tmp_path / "run"):
        for resume in (False, True):
            with pytest.raises(MachineError) as caught:
                trial.open_writer(tmp_path / "run", resume=resume)
            when = r"\d{4}-\d\d-\d\d \d\d:\d\d:\d\d UTC"
            assert re.search(f"run is in use by process {os.getpid()} since {when}$", str(caught.value))
            assert caught.value.exit_code == 4
    assert not (tmp_path / "run" / ".lock").exists()


def test_a_folder_left_locked_by_a_killed_process_is_taken_over(tmp_path):
    stop_after(tmp_path / "run", 2)
    words = (
        "import os, signal, sys; from pathlib import Path; from swmodel.store.lock import FolderLock;"
        "held = FolderLock(Path(sys.argv[1])); os.kill(os.getpid(), signal.SIGKILL)"
    )
    environment = os.environ | {"PYTHONPATH": str(Path(trial.__file__).parents[1])}
    answer = subprocess.run([sys.executable, "-c", words, str(tmp_path / "run")], env=environment, check=False)
    assert answer.returncode == -9
    assert (tmp_path / "run" / ".lock").exists()
    with trial.open_writer(tmp_path / "run", resume=True):
        pass
    assert re.search(r"left locked by process \d+ since .* UTC, which has ended; taken over", _log(tmp_path / "run"))


@pytest.mark.parametrize(("alive", "free"), [(True, False), (False, True)])
def test_without_locks_of_the_file_system_the_process_number_decides(tmp_path, monkeypatch, alive, free):
    def refuse(*words):
        raise OSError(errno.ENOLCK, "no locks here")

    monkeypatch.setattr(lock.fcntl, "flock", refuse)
    gone = subprocess.Popen([sys.executable, "-c", ""])
    gone.wait()
    process = os.getppid() if alive else gone.pid
    (tmp_path / ".lock").write_text(json.dumps({"process": process, "since": "then"}))
    if free:
        lock.FolderLock(tmp_path).release()
        assert not (tmp_path / ".lock").exists()
    else:
        with pytest.raises(MachineError, match=f"in use by process {process} since then"):
            lock.FolderLock(tmp_path)


def test_the_lock_is_let_go_after_an_error(tmp_path):
    def fail():
        with trial.open_writer(tmp_path / "run") as writer:
            writer.write_diagnostics(0.0, {"mass": 1.0})
            raise ZeroDivisionError

    with pytest.raises(ZeroDivisionError):
        fail()
    assert not (tmp_path / "run" / ".lock").exists()
    np.testing.assert_array_equal(Run(tmp_path / "run").series["mass"], [1.0])  # the rows were written first


def test_many_rows_are_rewritten_seldom(tmp_path, monkeypatch):
    written = []
    flush = SeriesWriter.flush
    monkeypatch.setattr(SeriesWriter, "flush", lambda self: (written.append(1), flush(self)))
    rows = 20_000
    with trial.open_writer(tmp_path / "run") as writer:
        for k in range(rows):
            writer.write_diagnostics(float(k), {"mass": 1.0, "speed_max": 2.0})
    assert len(Run(tmp_path / "run").series.time) == rows
    # a burst of rows takes well under 10 s; one rewriting each half second at most, and one at the end
    assert len(written) <= 21


def test_the_log_opens_with_the_caution_and_has_utc_times(tmp_path):
    with trial.open_writer(tmp_path / "run"):
        pass
    first = _log(tmp_path / "run").splitlines()[0]
    assert re.fullmatch(r"\d{4}-\d\d-\d\dT\d\d:\d\d:\d\dZ INFO    " + re.escape(CAUTION), first)


def test_runs_of_one_name_are_numbered(tmp_path):
    names = []
    for _ in range(3):
        folder = free_folder(tmp_path, "front")
        folder.mkdir()
        names.append(folder.name)
    assert names == ["front", "front-2", "front-3"]


def test_snapshots_follow_each_other_in_time_and_have_the_shape_of_the_grid(tmp_path):
    with trial.open_writer(tmp_path / "run") as writer:
        writer.write_snapshot(60.0, trial.snapshot(GRID, 1))
        with pytest.raises(ValueError, match=r"a snapshot at 60\.0 s is not later than the one before, 60\.0 s"):
            writer.write_snapshot(60.0, trial.snapshot(GRID, 1))
        with pytest.raises(ValueError, match=r"v has shape \(4, 6\), not \(5, 6\)"):
            writer.write_snapshot(120.0, trial.snapshot(GRID, 2) | {"v": np.zeros((4, 6))})
        writer.write_diagnostics(0.0, {"mass": 1.0})
        with pytest.raises(ValueError, match=r"a row at 0\.0 s is not later than the one before, 0\.0 s"):
            writer.write_diagnostics(0.0, {"mass": 1.0})
        assert (writer.last_snapshot, writer.last_row) == (60.0, 0.0)
        with pytest.raises(ValueError, match="these differ: energy_budget/pressure, mass"):
            writer.write_diagnostics(60.0, {}, {"energy_budget": {"pressure": 1.0}})
    assert len(Run(tmp_path / "run").fields) == 1


def _log(folder):
    return (folder / "run.log").read_text(encoding="utf-8")


def test_a_checkpoint_file_is_plain_hdf5_without_filters(tmp_path):
    path = write_checkpoint(tmp_path, trial.checkpoint(GRID, 1), NO_PROVENANCE)
    with h5py.File(path) as file:
        assert file["level_0"]["eta"].compression is None
        assert bytes(file.attrs["comment"]).decode() == CAUTION
