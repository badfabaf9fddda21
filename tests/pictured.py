"""Runs that no model made: fields from closed formulas, stored as a run stores them, for the tests of pictures."""

from __future__ import annotations

import datetime
from pathlib import Path

import numpy as np

from swmodel.outlook.plan import make_basin
from swmodel.pictures import FIGURES
from swmodel.pictures.page import our_style
from swmodel.pictures.scene import Scene
from swmodel.settings import read
from swmodel.store.output import resolve_output
from swmodel.store.provenance import Provenance
from swmodel.store.writer import RunWriter
from swmodel.theory.adjustment import adjusting_step

EPOCH = datetime.datetime(2000, 1, 1)

FRONT = """\
title = "A step in the made-up Sarn Bank"
question = "How wide is what stays?"
[frame]
latitude = "45 deg"
[layer]
depth = "100 m"
reduced_gravity = "0.02 m/s^2"
[grid]
cells = [128, 4]
size = ["550 km", "17 km"]
[edges]
west = "wall"
east = "wall"
south = "periodic"
north = "periodic"
[[start]]
kind = "formula"
eta = "0.5 * sign(x)"
[numerics]
linear = true
[time]
until = "3.6 day"
[output]
every = "4.8 h"
[[expect]]
claim = "What stays is one deformation radius wide"
measure = { kind = "decay_length", of = "eta", along = "x", from = 0, to = "70 km", during = ["2.2 day", "3.6 day"] }
value = "deformation_radius"
within = "8 %"
because = "two inertial periods leave some 4 % of doubt"
[[expect]]
claim = "Energy stays"
measure = { kind = "change", of = "energy" }
value = 0
within = 1e-3
because = "nothing takes it away"
"""

EDDY = """\
title = "An eddy in the made-up Vell Sea"
[frame]
latitude = "-30 deg"
[layer]
depth = "500 m"
[grid]
cells = [40, 30]
size = ["400 km", "300 km"]
[edges]
west = "periodic"
east = "periodic"
south = "wall"
north = "wall"
[[start]]
kind = "formula"
eta = "0.2 * exp(-(x**2 + y**2)/5e4**2)"
[time]
until = "10 h"
[output]
every = "1 h"
[[expect]]
claim = "The eddy stays as high as it is"
measure = { kind = "amplitude", of = "eta", during = ["0 h", "10 h"] }
value = "20 cm"
within = "50 %"
because = "it drifts, and a cell is a tenth of it"
"""


def changed(text: str, *edits: tuple[str, str]) -> str:
    """Return a configuration with texts exchanged, each of which must stand in it."""
    for old, new in edits:
        assert old in text, old
        text = text.replace(old, new)
    return text


def front_run(folder: Path, text: str = FRONT) -> Path:
    """Store the unbounded step on its way to balance (Cahn 1945), along x."""

    def state(basin, t):
        frame, grid = basin.frame, basin.grid
        known = {"eta0": 0.5, "gravity": basin.gravity, "depth": basin.reference_depth, "f0": frame.f0}
        u = adjusting_step(grid.x_face, t, **known)[0]
        _, v, eta = adjusting_step(grid.x, t, **known)
        return u * (t > 0), v, eta

    return stored_run(folder, text, state)


def eddy_run(folder: Path, text: str = EDDY) -> Path:
    """Store a round hill that drifts eastward at 2 m/s, with its flow in geostrophic balance."""

    def state(basin, t):
        grid, f0, g = basin.grid, basin.frame.f0, basin.gravity

        def eta(x, y):
            return 0.2 * np.exp(-((x - 2 * t) ** 2 + y**2) / 5e4**2)

        x, y = grid.points("u")
        u = g / f0 * 2 * y / 5e4**2 * eta(x, y)
        x, y = grid.points("v")
        v = -g / f0 * 2 * (x - 2 * t) / 5e4**2 * eta(x, y)
        return u, v, eta(*grid.points("centre"))

    return stored_run(folder, text, state)


def stored_run(folder: Path, text: str, state) -> Path:
    """Store what `state` (basin and time to u, v, eta, which broadcast) gives at the times of a configuration."""
    config = folder.with_suffix(".toml")
    config.write_text(text, "utf-8")
    experiment = read(config)
    basin = make_basin(experiment)
    every = experiment.output.every
    output = resolve_output(experiment.output, basin.grid, experiment.time.until, every)
    versions = {"swmodel": "0.1.0"}
    provenance = Provenance(text, experiment.as_json(), "swmodel run", versions, "0123456789abcdef")
    with RunWriter(folder, basin, provenance=provenance, output=output, epoch=EPOCH) as writer:
        for n in range(round(experiment.time.until / every) + 1):
            t = n * every
            fields = {
                name: np.broadcast_to(values, basin.grid.shape(location)).astype(np.float64)
                for name, location, values in zip(("u", "v", "eta"), ("u", "v", "centre"), state(basin, t), strict=True)
            }
            writer.write_snapshot(t, fields)
            kinetic = 0.2 * np.sin(t / 3e4) ** 2
            values = {"mass": 1.0, "energy_kinetic": 5e6 * kinetic, "energy_potential": 5e6 * (1 - kinetic - 1e-9 * n)}
            terms = {"kinetic": 3.0, "potential": -3.0, "time_stepping": 2e-6, "change": 2e-6, "residual": 1e-15 * n}
            writer.write_diagnostics(t, values, {"energy_budget": terms})
        writer.finish()
    return folder


def figures_of(folder, *names):
    """Painted figures by the name of their file."""
    scene = Scene.of(folder)
    drawn = {}
    with our_style():
        for name in names or FIGURES:
            for drawing in FIGURES[name].drawings(scene):
                drawn[drawing.name] = drawing.paint().figure
    return drawn
