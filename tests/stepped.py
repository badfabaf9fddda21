"""A small experiment for the tests of commands, and what they ask of runs."""

from __future__ import annotations

import time

import numpy as np

import swmodel
from swmodel.store.reading import Run

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
