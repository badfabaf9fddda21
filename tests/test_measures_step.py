"""The adjusting step, advanced here with the plain equations alone, against Rossby's end state through the measures."""

import numpy as np
import pytest
from synthetic import measure

from swmodel.dynamics.reference import tendency
from swmodel.frame import FrameSettings, build_frame
from swmodel.grid import Basin, Grid
from swmodel.measures import Record

STEPS_AN_OUTPUT = 7
DT = 2880.0 / STEPS_AN_OUTPUT  # s; 0.75 of the stepper's limit, and 108 outputs are 3.6 day


@pytest.fixture(scope="module")
def record():
    """A step of 0.5 m in a layer of 100 m and g' = 0.02 m/s^2 at 45 N, linear, 512 cells of 1074 m, for 3.6 day."""
    frame = build_frame(FrameSettings(latitude="45 deg"), 0.0)
    edges = {"west": "wall", "east": "wall", "south": "periodic", "north": "periodic"}
    grid = Grid(512, 1, 550e3 / 512, 550e3 / 512, -275e3, 0.0, **edges)
    basin = Basin(grid, frame, 0.02, 100.0, 100.0)
    shared = {"depth": 100.0, "f": basin.f, "gravity": 0.02, "dx": grid.dx, "dy": grid.dy, "linear": True}

    def rate(state):
        return tendency(*state, edges=("wall", "wall", "periodic", "periodic"), **shared)

    state = [np.zeros(grid.shape("u")), np.zeros(grid.shape("v")), 0.5 * np.sign(grid.x)[None, :]]
    kept, times = [state], [0.0]
    for step in range(1, 108 * STEPS_AN_OUTPUT + 1):
        # Shu & Osher 1988, three stages
        first = [y + DT * k for y, k in zip(state, rate(state), strict=True)]
        second = [0.75 * y + 0.25 * (z + DT * k) for y, z, k in zip(state, first, rate(first), strict=True)]
        state = [y / 3 + 2 / 3 * (z + DT * k) for y, z, k in zip(state, second, rate(second), strict=True)]
        if step % STEPS_AN_OUTPUT == 0:
            kept.append(state)
            times.append(step * DT)
    fields = {name: np.array([one[i] for one in kept]) for i, name in enumerate(("u", "v", "eta"))}
    return Record.from_memory(basin, np.array(times), fields, linear=True)


def test_what_stays_of_the_step_is_one_deformation_radius_wide(record):
    a = record.basin.deformation_radius
    line = {"of": "eta", "along": "x", "from_": "0 km", "to": "70 km"}
    finding = measure("decay_length", **line, during=["2.2 day", "3.6 day"]).take(record)
    assert finding.reason == ""
    # Rossby 1938: a; two inertial periods leave some 4 % of doubt, and the measure's own error says so
    assert abs(finding.value - a) < finding.fit_error
    assert finding.fit_error == pytest.approx(0.045 * a, rel=0.2)
    # what is left of the swing after averaging moves the length by less than a hundredth
    assert finding.value == pytest.approx(a, rel=0.01)
    # one instant swings with the inertial wake by more than that
    single = [measure("decay_length", **line, during=time).take(record).value / a for time in record.times[-42::6]]
    assert min(single) < 0.97
    assert max(single) > 1.02


def test_a_third_of_the_released_energy_stays_as_flow(record):
    a = record.basin.deformation_radius
    strip = {"along": "x", "from_": -8 * a, "to": 8 * a, "during": ["2.2 day", "3.6 day"]}
    finding = measure("energy_ratio", of="kinetic", over="released_potential", **strip).take(record)
    # Gill 1982 ch. 7: 1/3; the mean over two inertial periods keeps a hundredth of the swing
    assert finding.value == pytest.approx(1 / 3, abs=0.01)
    assert abs(finding.value - 1 / 3) < finding.fit_error
    # one instant swings between a quarter and two thirds
    assert np.min(finding.evidence.values) < 0.3
    assert np.max(finding.evidence.values) > 0.6
