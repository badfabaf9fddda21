"""The model: whole steps, exact times, the guard, halving, and going back to a checkpoint bit for bit."""

from __future__ import annotations

import math
from dataclasses import replace

import numpy as np
import pytest

from swmodel.dynamics import PV_FLUXES
from swmodel.errors import RequestError, SolutionError
from swmodel.model import Model, run
from swmodel.outlook import check
from swmodel.outlook.plan import make_plan
from swmodel.settings import Experiment
from swmodel.steppers import STEPPERS

DAY = 86400.0
# an invented light layer in a channel along y, c = 1.41 m/s
TABLES = {
    "frame": {"latitude": "45 deg"},
    "layer": {"depth": "100 m", "reduced_gravity": "0.02 m/s^2"},
    "grid": {"cells": [24, 20], "size": ["240 km", "180 km"]},
    "edges": {"west": "wall", "east": "wall", "south": "periodic", "north": "periodic"},
    "start": [{"kind": "vortex", "profile": "shielded", "speed": "0.3 m/s", "radius": "30 km"}],
    "time": {"until": "2 day"},
    "output": {},
}


def experiment(**tables):
    """The experiment with other keys in some tables."""
    values = {
        name: table | tables.get(name, {}) if isinstance(table, dict) else tables.get(name, table)
        for name, table in TABLES.items()
    }
    return Experiment.from_json(values | {name: tables[name] for name in tables.keys() - TABLES.keys()})


def make_model(**tables):
    return Model(experiment(**tables))


def bits(model):
    return [field.tobytes() for field in (model.u, model.v, model.eta)]


def same(one, other):
    return one.time == other.time and one.steps == other.steps and bits(one) == bits(other)


def test_the_model_starts_with_its_start():
    wanted = experiment()
    plan = make_plan(wanted)
    model = Model(wanted, plan=plan)
    assert model.time == 0
    assert model.steps == 0
    for own, given in zip((model.u, model.v, model.eta), (plan.start.u, plan.start.v, plan.start.eta), strict=True):
        assert np.array_equal(own, given)


def test_advance_takes_whole_steps_and_names_the_nearest_for_others():
    model = make_model(time={"step": "600 s"})
    model.advance("1 h")
    assert model.steps == 6
    assert model.time == 3600.0
    model.advance(1200.0)
    assert model.time == 4800.0
    model.advance(0.0)
    assert model.time == 4800.0
    for span, message in (
        (700.0, "11.7 min is no whole number of steps of 600 s; the nearest is 600 s"),
        (-600.0, "-10 min is no whole number of steps of 600 s; the nearest is 600 s"),
        ("1000 s", "16.7 min is no whole number of steps of 600 s; the nearest is 1200 s"),
        (1.0, "1 s is no whole number of steps of 600 s; the nearest is 600 s"),
    ):
        with pytest.raises(RequestError) as error:
            model.advance(span)
        assert str(error.value) == message
    assert model.time == 4800.0


@pytest.mark.parametrize("stepper", STEPPERS)
def test_one_long_advance_is_many_short_ones_to_the_last_bit(stepper):
    time = {"stepper": stepper, "step": "480 s"}
    whole, parts = make_model(time=time), make_model(time=time)
    whole.advance("2 day")
    for steps in (1, 2, 50, 51, 7, 249):
        parts.advance(steps * 480.0)
    assert whole.steps == 360
    assert same(whole, parts)


def test_what_is_written_into_the_views_is_what_runs_on():
    one, other = make_model(), make_model()
    one.advance(one.dt)
    other.advance(other.dt)
    other.eta[...] = other.eta + 0.0
    other.eta[3, 4] += 1.0
    one.advance(3 * one.dt)
    other.advance(3 * other.dt)
    # the disturbance has spread by the stencil of 9 stages at least, round the periodic direction too
    assert np.count_nonzero(one.eta != other.eta) > 9**2


def test_a_start_and_a_flux_of_ones_own_are_taken():
    class Uniform:
        def fields(self, basin):
            u, v, eta = (np.zeros(basin.grid.shape(where)) for where in ("u", "v", "centre"))
            return u, v + 0.25, eta

    model = Model(experiment(), start=Uniform(), pv_flux=PV_FLUXES["energy"])
    assert np.all(model.v == 0.25)
    assert model.equations.pv_flux is PV_FLUXES["energy"]


# -------------------------------------------------------------------------------------------------- the guard


def failed(model, span):
    with pytest.raises(SolutionError) as caught:
        model.advance(span)
    return caught.value


def assert_kept(model, error):
    """The state is the last good one, one step before the error."""
    assert math.isfinite(error.time)
    assert model.time == pytest.approx(error.time - model.dt, rel=1e-12)
    assert model.time == pytest.approx(model.steps * model.dt, rel=1e-12)
    for field in (model.u, model.v, model.eta):
        assert np.all(np.isfinite(field))
    assert np.all(model.basin.depth_field + model.eta > 0)
    assert set(model.diagnostics()) >= {"mass", "energy_kinetic"}


def test_a_step_too_long_for_the_flow_is_named_as_the_cause():
    # [time] speed promises no flow, so that a step at the limit of the waves is taken; the flow then is 2 m/s
    model = make_model(
        start=[{"kind": "formula", "u": "2*cos(pi*x/Lx)*sin(2*pi*y/Ly)", "v": "2*cos(2*pi*y/Ly)"}],
        time={"speed": "0 m/s", "margin": 1.0, "until": "2 day"},
    )
    error = failed(model, "2 day")
    assert f"the step of {model.dt:.6g} s is too long for the flow" in str(error)
    assert "of the stability limit): shorten it, or give [time] speed" in str(error)
    assert_kept(model, error)


@pytest.mark.parametrize("stepper", STEPPERS)
def test_a_start_that_outcrops_is_named_as_the_cause(stepper):
    # an anticlockwise vortex that no pressure holds flings the layer out of its middle
    model = make_model(
        start=[{"kind": "vortex", "profile": "shielded", "speed": "8 m/s", "radius": "40 km", "balance": "none"}],
        time={"speed": "60 m/s", "until": "1 day", "stepper": stepper},
    )
    error = failed(model, "1 day")
    assert str(error).startswith("the layer dries at ")
    assert f"(step {model.steps + 1}) at x = " in str(error)
    assert str(error).endswith(
        "likely cause: the layer outcrops, and there is no wetting and drying: lower the amplitude or deepen the layer"
    )
    assert_kept(model, error)
    # the place is where the layer is thin already
    j = int((error.place[1] - model.basin.grid.south_y) / model.basin.grid.dy)
    i = int((error.place[0] - model.basin.grid.west_x) / model.basin.grid.dx)
    thickness = model.basin.depth_field + model.eta
    assert thickness[j, i] < np.quantile(thickness, 0.1)


@pytest.mark.parametrize("cells", [[24, 20], [2, 1], [1, 1]])
def test_a_value_that_is_not_finite_is_noticed_with_its_place_and_nothing_warns(cells):
    # the square of 1e160 is beyond what a double holds; on the smallest grids no number is left at all
    model = make_model(
        grid={"cells": cells},
        edges={"west": "periodic", "east": "periodic"},
        start=[{"kind": "formula", "u": "1e160*(1 + 0.1*x/Lx)", "v": 1e160}],
        time={"speed": "0 m/s"},
    )
    before = bits(model)
    error = failed(model, model.dt)
    assert str(error).startswith("a value is not finite at ")
    assert "too long for the flow" in str(error)
    assert model.steps == 0
    assert bits(model) == before


def test_a_failed_run_keeps_its_last_good_state_in_a_checkpoint(tmp_path):
    # the same through the whole chain: what was stored stays readable, and the checkpoint is finite
    from swmodel.store.checkpoints import read_checkpoint
    from swmodel.store.reading import Run

    wanted = experiment(
        start=[{"kind": "vortex", "profile": "shielded", "speed": "8 m/s", "radius": "40 km", "balance": "none"}],
        time={"speed": "60 m/s", "until": "1 day"},
        output={"every": "20 min"},
    )
    outlook = replace(check(wanted), cost=None)
    with pytest.raises(SolutionError, match=r"the last good state, at .*, is in .*checkpoints") as caught:
        run(wanted, tmp_path / "run", outlook=outlook)
    kept = read_checkpoint(tmp_path / "run")
    assert kept.time == pytest.approx(caught.value.time - kept.dt, rel=1e-12)
    assert all(np.all(np.isfinite(field)) for level in kept.levels for field in level)
    times = Run(tmp_path / "run").fields.times
    assert len(times) == 1 + int(kept.time // 1200)


# ------------------------------------------------------------------------------- times, and a step that is halved


@pytest.mark.parametrize("stepper", STEPPERS)
def test_output_times_are_hit_exactly(tmp_path, stepper):
    wanted = experiment(
        time={"until": "25 h", "stepper": stepper}, output={"every": "100 min", "diagnostics_every": "25 min"}
    )
    done = run(wanted, tmp_path / "run", outlook=replace(check(wanted), cost=None))
    # seconds in double: exact to round-off of steps times dt
    np.testing.assert_allclose(done.fields.times, 6000.0 * np.arange(16), rtol=1e-14)
    np.testing.assert_allclose(done.series.time, 1500.0 * np.arange(61), rtol=1e-14)


# the start says 1 cm/s, and the raised layer then runs at over 2 m/s
GROWING = {
    "start": [{"kind": "formula", "eta": "80*exp(-(x**2 + y**2)/(20e3)**2)", "v": 0.01}],
    "time": {"until": "12 h", "margin": 0.9},
}


def test_a_step_that_the_flow_outgrows_is_halved_and_times_stay(caplog):
    model = make_model(**GROWING)
    dt = model.dt
    assert not model.halve_step_if_outgrown()
    model.advance(10 * dt)
    assert model.halve_step_if_outgrown()
    assert "the flow has outgrown the step" in caplog.text
    assert model.dt == dt / 2
    assert model.halvings == 1
    assert not model.halve_step_if_outgrown()
    model.advance(dt / 2)
    assert model.time == pytest.approx(10.5 * dt, rel=1e-15)
    model.advance(dt)
    assert model.time == pytest.approx(11.5 * dt, rel=1e-15)


def test_a_given_step_is_never_halved():
    model = make_model(start=GROWING["start"], time={"until": "12 h", "step": "1200 s", "margin": 1.0})
    model.advance("3 h")
    assert not model.halve_step_if_outgrown()
    assert model.dt == 1200.0


# a vortex of 0.8 m/s where [time] speed promises stillness
OUTGROWN = {
    "grid": {"size": ["60 km", "45 km"]},
    "start": [{"kind": "vortex", "profile": "shielded", "speed": "-0.8 m/s", "radius": "8 km"}],
    "time": {"until": "12 h", "margin": 0.9, "speed": "0 m/s"},
    "output": {"every": "2 h"},
}


def test_a_run_whose_step_is_halved_still_hits_its_output_times(tmp_path):
    wanted = experiment(**OUTGROWN)
    done = run(wanted, tmp_path / "run", outlook=replace(check(wanted), cost=None))
    assert "the flow has outgrown the step" in (tmp_path / "run" / "run.log").read_text("utf-8")
    np.testing.assert_allclose(done.fields.times, 7200.0 * np.arange(7), rtol=1e-14)


# ------------------------------------------------------------------------------------------------ checkpoints


@pytest.mark.parametrize("steps", [0, 1, 2, 5, 53])
@pytest.mark.parametrize("stepper", STEPPERS)
def test_going_back_to_a_checkpoint_changes_no_bit(stepper, steps):
    time = {"stepper": stepper}
    straight = make_model(time=time)
    straight.take(steps)
    kept = straight.checkpoint()
    assert len(kept.levels) == (2 if stepper == "leapfrog" and steps else 1)
    straight.take(31)
    other = make_model(time=time)
    other.take(3)
    other.restore(kept)
    other.take(31)
    assert same(straight, other)
    # and a checkpoint held in memory is a copy
    other.restore(kept)
    assert other.steps == steps
    other.take(31)
    assert same(straight, other)


@pytest.mark.parametrize("stepper", STEPPERS)
def test_a_checkpoint_knows_of_a_step_that_was_halved(stepper):
    straight, other = (make_model(**OUTGROWN | {"time": OUTGROWN["time"] | {"stepper": stepper}}) for _ in range(2))
    straight.take(10)
    assert straight.halve_step_if_outgrown()
    kept = [straight.checkpoint()]
    straight.take(3)
    kept.append(straight.checkpoint())
    straight.take(20)
    for checkpoint, steps in zip(kept, (23, 20), strict=True):
        other.restore(checkpoint)
        assert other.halvings == 1
        other.take(steps)
        assert same(straight, other)


def test_single_precision_goes_back_bit_for_bit_too():
    grid = {"precision": "single"}
    # of the types that other tests compile
    numerics = {"pv_flux": "energy"}
    straight, other = (make_model(grid=grid, numerics=numerics, time={"stepper": "leapfrog"}) for _ in range(2))
    straight.take(5)
    other.restore(straight.checkpoint())
    straight.take(20)
    other.take(20)
    assert straight.eta.dtype == np.float32
    assert same(straight, other)
