"""Records in memory whose answers are known by hand, for the tests of the measures and of the judge."""

import numpy as np

from swmodel.frame import FrameSettings, build_frame
from swmodel.grid import Basin, Grid
from swmodel.measures import MEASURES, ExpectSettings, Record

OF_ETA = {"kind": "amplitude", "of": "eta"}
TURNING = {"kind": "frequency", "of": "velocity", "at": [0, 0]}

HOUR = 3600.0
DAY = 86400.0

PERIODIC = {"west": "periodic", "east": "periodic", "south": "periodic", "north": "periodic"}
WALLS = {"west": "wall", "east": "wall", "south": "wall", "north": "wall"}
CHANNEL = PERIODIC | {"south": "wall", "north": "wall"}


def make_basin(nx=16, ny=8, dx=1000.0, dy=500.0, *, edges=PERIODIC, f0=1e-4, gravity=0.02, depth=100.0, **frame):
    """An f-plane (or whatever `frame` says) over an even depth, its origin in the south-west corner."""
    settings = FrameSettings(f0=f0, **frame) if f0 is not None else FrameSettings(**frame)
    grid = Grid(nx, ny, dx, dy, 0.0, 0.0, **edges)
    return Basin(grid, build_frame(settings, grid.Ly / 2), gravity, depth, depth)


def make_record(basin, times, *, eta=None, u=None, v=None, linear=True, **more):
    """A record of functions of (x, y, t), each at its own points; what is not given is 0."""
    grid = basin.grid
    fields = {}
    for name, location, function in (("eta", "centre", eta), ("u", "u", u), ("v", "v", v)):
        x, y = grid.points(location)
        shape = grid.shape(location)
        values = [np.zeros(shape) if function is None else np.broadcast_to(function(x, y, t), shape) for t in times]
        fields[name] = np.array(values)
    return Record.from_memory(basin, np.asarray(times, float), fields, linear=linear, **more)


def measure(kind, **keys):
    """Read a measure as a configuration does; `from_` stands for the key `from`."""
    keys = {key.rstrip("_"): value for key, value in keys.items()}
    return MEASURES[kind].model_validate({"kind": kind, **keys})


def told(one, record, period=None):
    """What would be refused before the run: keys and what was found."""
    return [(".".join(map(str, fault.key)), fault.found) for fault in one.faults(record, period)]


def expect(**keys):
    keys = {"claim": "It stays", "measure": OF_ETA, "value": "1 m", "within": "10 %", "because": "a test"} | keys
    return ExpectSettings.model_validate(keys)


def turning_record(basin=None, count=49):
    basin = basin or make_basin()
    f0 = basin.frame.f0
    return make_record(
        basin, np.arange(count) * HOUR, u=lambda x, y, t: 0.3 * np.cos(f0 * t), v=lambda x, y, t: -0.3 * np.sin(f0 * t)
    )
