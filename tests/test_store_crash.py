"""Nothing acknowledged is lost, and every file can be read, wherever a run is cut off."""

import errno
import json
import math
import os
import resource
import subprocess
import sys
from pathlib import Path

import h5py
import numpy as np
import pytest
import store_trial as trial

from swmodel.errors import MachineError
from swmodel.store import durable, parts
from swmodel.store.checkpoints import read_checkpoint
from swmodel.store.reading import Run

KILLS, ALL_KILLS = 8, 250
CUTS = 16  # evenly over the calls of a run; the slow test cuts after every one
SNAPSHOTS = trial.SNAPSHOTS


class Cut(BaseException):
    """The process is gone."""


class CountedOs:
    """The os module of `durable`, which does nothing more after so many calls that change the disk."""

    CHANGING = ("write", "fsync", "ftruncate", "replace", "unlink", "link")

    def __init__(self, limit=math.inf):
        self.calls = 0
        self.limit = limit

    def __getattr__(self, name):
        call = getattr(os, name)
        return self._counted(call) if name in self.CHANGING else call

    def _counted(self, call):
        def counted(*words):
            if self.calls >= self.limit:
                raise Cut
            self.calls += 1
            return call(*words)

        return counted


def run_cut_after(folder, monkeypatch, limit):
    """Run until so many calls were made; return what was acknowledged, and how many calls there were."""
    said = []
    counted = CountedOs(limit)
    with monkeypatch.context() as patch:
        patch.setattr(durable, "os", counted)
        patch.setattr(parts, "TOGETHER", 2)
        try:
            with trial.open_writer(folder) as writer:
                trial.write_run(writer, trial.make_basin().grid, SNAPSHOTS, said.append)
        except Cut:
            pass
    return said.count(b"s"), said.count(b"c"), counted.calls


def resume_to_end(folder, monkeypatch):
    with monkeypatch.context() as patch:
        patch.setattr(parts, "TOGETHER", 2)
        with trial.open_writer(folder, resume=True) as writer:
            trial.write_run(writer, trial.make_basin().grid, SNAPSHOTS)


def cut_and_check(tmp_path, monkeypatch, limits):
    grid = trial.make_basin().grid
    for limit in limits:
        folder = tmp_path / str(limit)
        snapshots, checkpoints, _ = run_cut_after(folder, monkeypatch, limit)
        assert trial.faults_of(folder, grid, snapshots, checkpoints) == [], f"cut after call {limit}"
        if checkpoints:
            resume_to_end(folder, monkeypatch)
            assert trial.faults_of(folder, grid, SNAPSHOTS, 3) == [], f"resumed after a cut after call {limit}"
            assert not (folder / "parts").exists()


def calls_of_a_run(tmp_path, monkeypatch):
    return run_cut_after(tmp_path / "whole", monkeypatch, math.inf)[2]


def test_a_cut_between_two_system_calls_loses_nothing_acknowledged(tmp_path, monkeypatch):
    calls = calls_of_a_run(tmp_path, monkeypatch)
    # between two renames files are only written beside: an even choice meets renames, flushes and removals alike
    cut_and_check(tmp_path, monkeypatch, np.linspace(0, calls - 1, CUTS).astype(int))


@pytest.mark.slow
def test_a_cut_after_every_single_system_call_loses_nothing_acknowledged(tmp_path, monkeypatch):
    cut_and_check(tmp_path, monkeypatch, range(calls_of_a_run(tmp_path, monkeypatch)))


@pytest.mark.slow
def test_a_resumption_can_be_cut_after_every_single_system_call(tmp_path, monkeypatch):
    """Also one that begins from a run that had ended: the plain file becomes a part again."""
    grid = trial.make_basin().grid
    limit = 0
    while True:
        folder = tmp_path / str(limit)
        run_cut_after(folder, monkeypatch, math.inf)
        counted = CountedOs(limit)
        with monkeypatch.context() as patch:
            patch.setattr(durable, "os", counted)
            try:
                with trial.open_writer(folder, resume=True):
                    pass
            except Cut:
                pass
        # the last checkpoint is that of snapshot 6, and so what is later is given up
        assert trial.faults_of(folder, grid, 7, 3) == [], f"cut after call {limit}"
        resume_to_end(folder, monkeypatch)
        assert trial.faults_of(folder, grid, SNAPSHOTS, 3) == [], f"resumed after a cut after call {limit}"
        if counted.calls < limit:
            break
        limit += 1


def killed(tmp_path, trials, seed):
    command = [sys.executable, str(Path(trial.__file__)), str(tmp_path), str(trials), str(seed)]
    root = str(Path(trial.__file__).parents[1])
    environment = os.environ | {"PYTHONPATH": root}
    answer = subprocess.run(command, capture_output=True, text=True, env=environment, check=False)
    assert answer.returncode == 0, answer.stderr
    return json.loads(answer.stdout)


@pytest.mark.skipif(not hasattr(os, "fork"), reason="kills processes that it forks")
def test_a_run_killed_at_random_instants_loses_nothing_acknowledged(tmp_path):
    result = killed(tmp_path, KILLS, seed=20)
    assert result["faults"] == []
    assert result["trials"] == KILLS


@pytest.mark.slow
@pytest.mark.skipif(not hasattr(os, "fork"), reason="kills processes that it forks")
def test_a_run_killed_at_very_many_random_instants_loses_nothing_acknowledged(tmp_path):
    result = killed(tmp_path, ALL_KILLS, seed=21)
    assert result["faults"] == []
    assert len(set(result["snapshots"])) == SNAPSHOTS + 1  # the kills met a run at each of its snapshots


def test_a_missing_part_is_noticed_and_never_read_as_no_data(tmp_path):
    with trial.open_writer(tmp_path / "run") as writer:
        for k in range(3):
            writer.write_snapshot(k * trial.STEP, trial.snapshot(trial.make_basin().grid, k))
    lost = next((tmp_path / "run" / "parts").glob("snapshots-00000001-*.h5"))
    lost.unlink()
    with h5py.File(tmp_path / "run" / "snapshots.h5") as file:
        assert np.isnan(file["eta"][1]).all()  # what any other program sees
    run = Run(tmp_path / "run")
    assert run.fields.field("eta", 0).shape == (4, 6)
    with pytest.raises(MachineError, match=r"snapshots-00000001-00000001\.h5: it is missing"):
        run.fields.field("eta", 1)
    with pytest.raises(MachineError, match="it is missing"):
        run.snapshots()


def test_an_index_opened_during_the_run_can_still_be_read_after_the_next_joining(tmp_path, monkeypatch):
    monkeypatch.setattr(parts, "TOGETHER", 2)
    grid = trial.make_basin().grid
    with trial.open_writer(tmp_path / "run") as writer:
        for k in range(3):
            writer.write_snapshot(k * trial.STEP, trial.snapshot(grid, k))
        file = h5py.File(tmp_path / "run" / "snapshots.h5")
        reader = Run(tmp_path / "run").fields
        writer.write_snapshot(3 * trial.STEP, trial.snapshot(grid, 3))  # one part is made of all four
        for k in range(3):
            np.testing.assert_array_equal(file["eta"][k], trial.field(grid, "eta", k))
        file.close()
        for k in range(4, 8):
            writer.write_snapshot(k * trial.STEP, trial.snapshot(grid, k))
        # our reader looks again where the snapshots lie
        np.testing.assert_array_equal(reader.field("eta", 1), trial.field(grid, "eta", 1))
        writer.finish()
    np.testing.assert_array_equal(reader.field("v", 0), trial.field(grid, "v", 0))


def pieces_after(folder, count):
    with trial.open_writer(folder, fields=("eta",)) as writer:
        for k in range(count):
            writer.write_snapshot(k * trial.STEP, trial.snapshot(trial.make_basin().grid, k, ("eta",)))
    with h5py.File(folder / "snapshots.h5") as file:
        return len(file["eta"].virtual_sources())


def test_parts_are_joined_so_that_the_index_stays_short(tmp_path):
    # in sixteens: 40 = 2 x 16 + 8
    assert pieces_after(tmp_path / "run", 40) == 10


def test_large_parts_are_left_apart(tmp_path, monkeypatch):
    monkeypatch.setattr(parts, "TOGETHER_BYTES", 100_000)  # 16 parts of 21 kB are more
    assert pieces_after(tmp_path / "run", 20) == 20


def fill_until_refused(folder, count=400):
    """Write until the machine refuses; return how many snapshots were acknowledged, and the refusal."""
    basin = trial.make_basin(40, 40)
    done = 0
    try:
        with trial.open_writer(folder, basin=basin, fields=("eta", "u", "v", "pv"), compression=False) as writer:
            writer.write_checkpoint(trial.checkpoint(basin.grid, 0))
            for k in range(count):
                writer.write_snapshot(k * trial.STEP, trial.snapshot(basin.grid, k, trial.LOCATIONS))
                done += 1
    except MachineError as error:
        return basin.grid, done, error
    pytest.fail("the machine refused nothing")


def assert_whole_after_refusal(folder, grid, done):
    assert list(folder.rglob(f"*{durable.BESIDE}")) == []
    assert not (folder / ".lock").exists()
    assert read_checkpoint(folder).steps == 0
    fields = Run(folder).fields if done else None
    assert done == (len(fields) if fields else 0)
    for k in range(done):
        np.testing.assert_array_equal(fields.field("pv", k), trial.field(grid, "pv", k))


def test_a_full_disk_ends_with_a_message_and_all_that_was_acknowledged(tmp_path):
    place = tmp_path / "disk"
    place.mkdir()
    mount = ["mount", "-t", "tmpfs", "-o", "size=2m", "none", str(place)]
    if (
        sys.platform != "linux"
        or os.geteuid() != 0
        or subprocess.run(mount, capture_output=True, check=False).returncode
    ):
        pytest.skip("mounting a small disk is not permitted")
    try:
        grid, done, refusal = fill_until_refused(place / "run")
        assert "No space left on device; what was written before stays readable" in str(refusal)
        assert refusal.exit_code == 4
        assert refusal.__cause__.errno == errno.ENOSPC
        assert done > 1
        assert_whole_after_refusal(place / "run", grid, done)
        # nothing is held open, and the library is in order: the same process can go on
        with h5py.File(tmp_path / "after.h5", "w") as file:
            file["x"] = 1.0
    finally:
        subprocess.run(["umount", str(place)], check=True)


def test_a_limit_on_file_size_ends_with_a_message_and_all_that_was_acknowledged(tmp_path, monkeypatch):
    monkeypatch.setattr(parts, "TOGETHER", 4)
    soft, hard = resource.getrlimit(resource.RLIMIT_FSIZE)
    resource.setrlimit(resource.RLIMIT_FSIZE, (150_000, hard))  # room for one part of 53 kB, not for four
    try:
        grid, done, refusal = fill_until_refused(tmp_path / "run")
    finally:
        resource.setrlimit(resource.RLIMIT_FSIZE, (soft, hard))
    assert "File too large; what was written before stays readable" in str(refusal)
    assert done == 3
    assert_whole_after_refusal(tmp_path / "run", grid, done)


def test_where_there_is_no_room_to_join_the_snapshots_they_stay_in_their_parts(tmp_path):
    soft, hard = resource.getrlimit(resource.RLIMIT_FSIZE)
    basin = trial.make_basin(40, 40)
    with trial.open_writer(tmp_path / "run", basin=basin, compression=False) as writer:
        for k in range(6):
            writer.write_snapshot(k * trial.STEP, trial.snapshot(basin.grid, k))
        resource.setrlimit(resource.RLIMIT_FSIZE, (150_000, hard))
        try:
            writer.finish()
        finally:
            resource.setrlimit(resource.RLIMIT_FSIZE, (soft, hard))
    assert "the snapshots stay in parts under their index" in (tmp_path / "run" / "run.log").read_text()
    np.testing.assert_array_equal(Run(tmp_path / "run").fields.field("v", 5), trial.field(basin.grid, "v", 5))


def test_every_call_that_the_machine_refuses_becomes_a_machine_error(tmp_path, monkeypatch):
    class Refusing(CountedOs):
        def _counted(self, call):
            def counted(*words):
                self.calls += 1
                if self.calls == self.limit:
                    raise OSError(errno.EIO, os.strerror(errno.EIO))
                return call(*words)

            return counted

    calls = calls_of_a_run(tmp_path, monkeypatch)
    grid = trial.make_basin().grid
    for limit in np.linspace(1, calls, CUTS).astype(int):
        folder, said = tmp_path / str(limit), []
        with monkeypatch.context() as patch:
            patch.setattr(durable, "os", Refusing(limit))
            patch.setattr(parts, "TOGETHER", 2)
            try:
                with trial.open_writer(folder) as writer:
                    trial.write_run(writer, grid, SNAPSHOTS, said.append)
            except MachineError as error:
                assert "Input/output error" in str(error)  # noqa: PT017  (near the end `finish` makes a warning of it)
        assert trial.faults_of(folder, grid, said.count(b"s"), said.count(b"c")) == [], f"call {limit} refused"
        assert list(folder.rglob(f"*{durable.BESIDE}")) == []


def test_a_folder_without_permission_is_a_machine_error(tmp_path):
    place = tmp_path / "closed"
    place.mkdir(mode=0o755)
    identity = os.geteuid()
    for folder in (tmp_path, *tmp_path.parents[:2]):
        folder.chmod(0o755)
    place.chmod(0o555)
    if identity == 0:
        os.seteuid(65534)  # to root everything is permitted
    try:
        with pytest.raises(MachineError, match="Permission denied"):
            trial.open_writer(place / "run")
    finally:
        os.seteuid(identity)
    assert list(place.iterdir()) == []
