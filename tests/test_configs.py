"""The starting points in configs/: what `swmodel new` hands out can be read, is not refused, and holds when run."""

from __future__ import annotations

import math
from pathlib import Path
from typing import Any

import jsonschema
import pytest
import tomli
from scipy.special import exp1

import swmodel
from swmodel.outlook.plan import make_basin
from swmodel.settings import schema

CONFIGS = {path.stem: path for path in sorted((Path(__file__).parent.parent / "configs").glob("*.toml"))}

# kernels compile for each combination of PV flux, even or uneven depth, linear or full equations and precision:
# what is run every time shares two of them, and each is a class, so that two workers compile side by side (leapfrog, in
# "inertial", would be a third)
LINEAR = ("front-south", "mars-front", "kelvin", "equatorial", "rossby")
FULL = ("vortex-balanced",)
OTHERS = sorted(set(CONFIGS) - {*LINEAR, *FULL})


def document(name: str) -> dict[str, Any]:
    return tomli.loads(CONFIGS[name].read_text("utf-8"))


def run_and_hold(name: str, folder: Path) -> None:
    """Run a starting point and ask for every expectation of it; on one thread, as other workers want the cores too."""
    run = swmodel.run(swmodel.read(CONFIGS[name], {"numerics.threads": "1"}), into=folder / name)
    verdict = run.verdict()
    words = {one["claim"]: (one["verdict"], one["found"]["value"], one["reason"]) for one in verdict["expectations"]}
    assert words
    assert {word for word, _, _ in words.values()} == {"holds"}, words
    assert verdict["overall"] == "holds"


class TestWritten:
    @pytest.mark.parametrize("name", CONFIGS)
    def test_a_starting_point_validates_against_the_schema(self, name: str) -> None:
        jsonschema.Draft202012Validator(schema()).validate(document(name))

    @pytest.mark.parametrize("name", CONFIGS)
    def test_a_starting_point_asks_a_question_of_an_invented_place(self, name: str) -> None:
        experiment = swmodel.read(CONFIGS[name])
        assert experiment.title
        assert experiment.question.endswith("?")
        assert "invented" in CONFIGS[name].read_text("utf-8")

    @pytest.mark.parametrize("name", CONFIGS)
    def test_a_starting_point_states_what_it_expects_and_why_that_near(self, name: str) -> None:
        expectations = swmodel.read(CONFIGS[name]).expect
        assert expectations
        # a reason is a clause, no word
        assert all(len(one.because.split()) >= 5 for one in expectations)

    @pytest.mark.parametrize("name", CONFIGS)
    def test_a_starting_point_is_not_refused(self, name: str) -> None:
        outlook = swmodel.check(swmodel.read(CONFIGS[name]))
        assert outlook.refusals == []
        # cautions that everyone is meant to pass over teach to pass over them: a lake's own swing raises two
        assert len(outlook.cautions) <= 2

    def test_the_starting_points_cover_what_there_is_to_choose_from(self) -> None:
        experiments = [swmodel.read(path) for path in CONFIGS.values()]
        assert {one.time.stepper for one in experiments} == {"ssprk3", "rk4", "leapfrog"}
        assert {one.numerics.pv_flux for one in experiments} == {"both", "energy", "enstrophy"}
        assert {one.grid.precision for one in experiments} == {"double", "single"}
        assert {one.edges.slip for one in experiments} == {"free", "none"}
        assert {one.frame.plane for one in experiments} >= {"f", "beta", "equatorial", "tank", "none"}
        assert {one.frame.body for one in experiments} >= {"earth", "mars"}
        assert {part.kind for one in experiments for part in one.start} >= {
            "step", "formula", "vortex", "jet", "poincare_wave", "kelvin_wave", "rossby_wave",
        }  # fmt: skip

    def test_the_southern_front_is_the_northern_one_but_for_the_latitude(self) -> None:
        north, south = (swmodel.read(CONFIGS[name]) for name in ("front", "front-south"))
        assert south.frame.latitude == -north.frame.latitude
        for table in ("layer", "grid", "edges", "numerics", "time"):
            assert getattr(north, table) == getattr(south, table), table


class TestNumbersWrittenOut:
    """Where theory has no name for a number, it stands in the file, and follows from what else stands there."""

    # written with four digits or more: half a unit of the last
    DIGITS = 5e-4

    def test_of_an_unbalanced_eddy_stays_what_its_potential_vorticity_holds(self) -> None:
        # the adjusted streamfunction is k^2/(k^2 + 1/a^2) of the first at each wavenumber (Gill 1982, chapter 7); its
        # energy is integrated over the Gaussian's spectrum
        experiment = swmodel.read(CONFIGS["vortex-unbalanced"])
        b = (experiment.start[0].radius / make_basin(experiment).deformation_radius) ** 2
        share = 1 - b + b**2 * math.exp(b) * exp1(b)
        assert experiment.expect[0].value.value == pytest.approx(share, rel=self.DIGITS)

    def test_the_beta_of_a_slope_is_f0_times_its_relative_slope(self) -> None:
        experiment = swmodel.read(CONFIGS["slope"])
        basin = make_basin(experiment)
        # the depth is exponential: its logarithm has one slope everywhere (Pedlosky 1987, chapter 3)
        log_depth = [math.log(float(basin.depth_field[row, 0])) for row in (0, -1)]
        slope = (log_depth[0] - log_depth[1]) / (basin.grid.y[-1] - basin.grid.y[0])
        assert experiment.expect[0].value.beta == pytest.approx(basin.frame.f0 * slope, rel=self.DIGITS)

    def test_the_crest_on_the_equator_has_gone_as_far_as_gravity_carries_it(self) -> None:
        experiment = swmodel.read(CONFIGS["equatorial"])
        way = make_basin(experiment).wave_speed * experiment.time.until
        assert experiment.expect[1].measure.at[0] == pytest.approx(way, rel=self.DIGITS)

    def test_the_meander_begins_as_the_perturbation_says(self) -> None:
        experiment = swmodel.read(CONFIGS["jet"])
        jet = experiment.start[0]
        k = 2 * math.pi * jet.perturbation.waves / experiment.grid.size[0]
        speed = jet.perturbation.size * jet.speed * jet.width * k
        assert experiment.expect[1].value.value == pytest.approx(speed, rel=self.DIGITS)

    def test_the_wavenumber_of_a_seiche_is_half_a_wave_along_the_lake(self) -> None:
        experiment = swmodel.read(CONFIGS["seiche"])
        assert experiment.expect[0].value.k == pytest.approx(math.pi / experiment.grid.size[0], rel=self.DIGITS)


class TestLinearOnesHold:
    @pytest.mark.parametrize("name", LINEAR)
    def test_it_runs_and_every_expectation_holds(self, name: str, tmp_path: Path) -> None:
        run_and_hold(name, tmp_path)


class TestFullOnesHold:
    @pytest.mark.parametrize("name", FULL)
    def test_it_runs_and_every_expectation_holds(self, name: str, tmp_path: Path) -> None:
        run_and_hold(name, tmp_path)


@pytest.mark.slow
class TestOthersHold:
    @pytest.mark.parametrize("name", OTHERS)
    def test_it_runs_and_every_expectation_holds(self, name: str, tmp_path: Path) -> None:
        run_and_hold(name, tmp_path)
