"""A small run for the tests of the store, and trials that kill it: ``python store_trial.py FOLDER TRIALS SEED``."""

import datetime
import json
import math
import os
import random
import signal
import sys
import time
from pathlib import Path

import h5py
import numpy as np

from swmodel.frame import FrameSettings, build_frame
from swmodel.grid import Basin, Grid
from swmodel.store import OutputSettings, parts, resolve_output
from swmodel.store.checkpoints import Checkpoint
from swmodel.store.provenance import Provenance
from swmodel.store.reading import Run
from swmodel.store.writer import RunWriter

EPOCH = datetime.datetime(2000, 1, 1)
STEP = 60.0  # s
SNAPSHOTS = 8
FIELDS = ("eta", "v")
LOCATIONS = {"eta": "centre", "u": "u", "v": "v", "pv": "corner"}
CONFIGURATION = '# an invented basin: "Sarn Bank", 3 °C\r\ntitle = "Stör"\n'


def make_basin(nx=6, ny=4, precision="double"):
    grid = Grid(nx, ny, 1000.0, 1500.0, -3000.0, 0.0, west="wall", east="wall", precision=precision)
    frame = build_frame(FrameSettings(latitude="45 deg"), middle_y=0.0)
    depth = 100.0 + np.arange(nx * ny, dtype=float).reshape(ny, nx)
    return Basin(grid, frame, 9.81, depth, 100.0)


def make_provenance(**more):
    settings = {"title": "Stör", "frame": {"latitude": math.pi / 4}, "time": {"until": 3600.0}} | more
    return Provenance(CONFIGURATION, settings, "swmodel run front.toml", {"swmodel": "0.1.0", "numpy": np.__version__})


def open_writer(folder, *, basin=None, resume=False, provenance=None, **settings):
    basin = basin or make_basin()
    output = resolve_output(OutputSettings(**({"fields": FIELDS} | settings)), basin.grid, 50 * STEP, STEP)
    provenance = provenance or make_provenance()
    return RunWriter(folder, basin, provenance=provenance, output=output, epoch=EPOCH, resume=resume)


def field(grid, name, k):
    """A field of snapshot k that no other snapshot, name or place shares."""
    ny, nx = grid.shape(LOCATIONS[name])
    number = sorted(LOCATIONS).index(name)
    values = k + number / 10 + np.arange(ny * nx).reshape(ny, nx) / 1000 + 1e-9 * np.sin(k)
    return values.astype(grid.dtype)


def snapshot(grid, k, names=FIELDS):
    return {name: field(grid, name, k) for name in names}


def checkpoint(grid, k):
    levels = [tuple(field(grid, name, k - n) / 3 for name in ("u", "v", "eta")) for n in (0, 1)]
    return Checkpoint(k * STEP, k, STEP, levels, {"energy_before": math.pi * k, "work": np.arange(3.0) * k})


def write_run(writer, grid, count, said=lambda what: None):
    """Write snapshots up to `count`, a row with each and a checkpoint with every third, and end in good order."""
    first = writer.checkpoint.steps + 1 if writer.checkpoint else 0
    for k in range(first, count):
        writer.write_diagnostics(k * STEP, {"mass": float(k)}, {"energy_budget": {"pressure": k / 7}})
        writer.write_snapshot(k * STEP, snapshot(grid, k))
        said(b"s")
        if k % 3 == 0:
            writer.write_checkpoint(checkpoint(grid, k))
            said(b"c")
    writer.finish()


def faults_of(folder, grid, snapshots, checkpoints):
    """What a folder lacks of what was acknowledged, and what in it cannot be read."""
    index = Path(folder) / "snapshots.h5"
    if not index.exists():
        return [f"{snapshots} snapshots acknowledged, and no file"] if snapshots else []
    faults = []
    with h5py.File(index) as file:  # as any other program sees it
        times = file["time"][()]
        if times.size < snapshots:
            faults.append(f"{snapshots} snapshots acknowledged, {times.size} there")
        faults += [f"snapshot {k} lies at {at} s" for k, at in enumerate(times) if at != k * STEP]
        faults += [
            f"{name} of snapshot {k} is wrong"
            for k in range(times.size)
            for name in FIELDS
            if not np.array_equal(file[name][k], field(grid, name, k))
        ]
        if not np.array_equal(file["depth"][()], make_basin().depth):
            faults.append("the depth is wrong")
    run = Run(folder)
    faults += [f"our reader finds another {name}" for name in FIELDS if not _same(run.fields, grid, name)]
    if not np.array_equal(run.series["mass"] if run.series.names else [], np.arange(run.series.time.size)):
        faults.append("the time series are wrong")
    newest = sorted((Path(folder) / "checkpoints").glob("*.h5"))
    if checkpoints and not newest:
        faults.append("no checkpoint")
    for path in newest:
        with h5py.File(path) as file:
            k = int(file.attrs["steps"])
            if not np.array_equal(file["level_1"]["v"][()], checkpoint(grid, k).levels[1][1]):
                faults.append(f"checkpoint {k} is wrong")
    if newest and k < 3 * (checkpoints - 1):
        faults.append(f"checkpoint {3 * (checkpoints - 1)} acknowledged, {k} is the newest")
    return faults


def _same(fields, grid, name):
    return all(np.array_equal(fields.field(name, k), field(grid, name, k)) for k in range(len(fields)))


def kill_once(folder, grid, count, delay):
    """Start a run in a process of its own, kill it after a time, and return what it acknowledged."""
    reading, writing = os.pipe()
    child = os.fork()
    if child == 0:
        os.close(reading)
        with open_writer(folder) as writer:
            write_run(writer, grid, count, lambda what: os.write(writing, what))
        os._exit(0)
    os.close(writing)
    time.sleep(delay)
    os.kill(child, signal.SIGKILL)
    os.waitpid(child, 0)
    said = b""
    while more := os.read(reading, 4096):
        said += more
    os.close(reading)
    return said.count(b"s"), said.count(b"c")


def main(folder, trials, seed):
    parts.TOGETHER = 2  # so that parts are joined, and joined again, within a short run
    count = SNAPSHOTS
    grid = make_basin().grid
    whole = folder / "whole"
    began = time.perf_counter()
    with open_writer(whole) as writer:
        write_run(writer, grid, count)
    lasts = time.perf_counter() - began
    rng = random.Random(seed)
    result = {"trials": 0, "snapshots": [], "resumed": 0, "faults": []}
    for n in range(trials):
        place = folder / f"{n:04d} a b%b"  # a name that a careless path would trip over
        snapshots, checkpoints = kill_once(place, grid, count, rng.uniform(0.0, 1.1 * lasts))
        result["trials"] += 1
        result["snapshots"].append(snapshots)
        faults = faults_of(place, grid, snapshots, checkpoints)
        if checkpoints and not faults:
            with open_writer(place, resume=True) as writer:
                write_run(writer, grid, count)
            result["resumed"] += 1
            faults = faults_of(place, grid, count, math.ceil(count / 3))
            faults += [
                f"{name} is left" for name in {p.name for p in place.iterdir()} ^ {p.name for p in whole.iterdir()}
            ]
        result["faults"] += [f"trial {n}: {fault}" for fault in faults]
    print(json.dumps(result))


if __name__ == "__main__":
    main(Path(sys.argv[1]), int(sys.argv[2]), int(sys.argv[3]))
