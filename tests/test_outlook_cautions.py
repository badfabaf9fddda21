"""Each caution is said where it should be, with the number that the formula gives, and not where it should not."""

from __future__ import annotations

import importlib
import math
import re
from typing import Any

import numpy as np
import pytest
from prospects import OMEGA, RADIUS, cautions, facts, outlook

from swmodel.outlook import CAUTIONS, Caution
from swmodel.outlook.returns import return_time, source
from swmodel.quantities import format_quantity

F45 = 2 * OMEGA * math.sin(math.pi / 4)
C = math.sqrt(0.02 * 100)  # sqrt(g H), Gill 1982, chapter 5
A = C / F45  # deformation radius, Gill 1982, chapter 7
PERIODIC = dict.fromkeys(("edges.west", "edges.east", "edges.south", "edges.north"), "periodic")
BOX = dict.fromkeys(("edges.west", "edges.east", "edges.south", "edges.north"), "wall")
F5_LEAST = 2 * OMEGA * (math.sin(math.radians(5)) - math.cos(math.radians(5)) * 1.5e6 / RADIUS)
WIDE = {
    "grid.cells": [64, 64],
    "grid.size": [3e6, 3e6],
    "output": {"every": 86400.0},
    "time.until": 86400.0,
    "expect": [],
}
SHELF = {"depth": "where(x < -165e3, 1, 100)", "reference_depth": 100.0}
BUMP = {"kind": "bump", "amplitude": 0.5, "radius": 3e5}


def front(**keys: Any) -> list[dict[str, Any]]:
    return [{"kind": "front", "amplitude": 0.5, "width": 2e4, **keys}]


# name of the caution: changes that bring it about, and what must stand in it
CASES: list[tuple[str, dict[str, Any], list[str]]] = [
    (
        "radius_unresolved",
        {"grid.cells": [32, 4]},
        ["the deformation radius is unresolved", f"holds {A / (550e3 / 32):.2g} cells along x"],
    ),
    (
        # a shelf of a hundredth of the depth over a fifth of the domain: there a is a tenth
        "radius_unresolved",
        {"layer": {**SHELF, "reduced_gravity": 0.02}, "start.0.eta": 0.01, "grid.cells": [512, 4]},
        ["unresolved in places", "20 % of the area"],
    ),
    (
        "start_unresolved",
        {"start": front(width=1000.0)},
        ["smallest scale of the start is unresolved", f"holds {1000 / (550e3 / 1024):.2g} cells along x"],
    ),
    ("jump_off_faces", {"start": [{"kind": "step", "amplitude": 0.5, "at": 600.0}]}, ["start.0", "x = 600 m"]),
    # 144 s a step: 1e6 steps, a quarter of the spacing of floats each
    (
        "single_precision",
        {"grid.precision": "single", "time.until": 1.44e8, "output": {"every": 1.44e5}, "expect": []},
        ["single precision is too coarse", f"{0.25 * 2**-23 * 1e6:.1g}"],
    ),
    ("waves_return", {"time.until": "6 day"}, ["walls along x", format_quantity(550e3 / C, "s")]),
    ("waves_return", {"time.until": "6 day", **PERIODIC}, ["come round 550 km", format_quantity(550e3 / C, "s")]),
    (
        "windows_after_return",
        {"time.until": "4.2 day", "expect.0.measure.during": [2e5, "4.1 day"]},
        ["expectation 1 looks on", "seen until 4.1 day"],
    ),
    # beta L/|f0| = cot(latitude) L/R, Pedlosky 1987, chapter 3
    (
        "plane_stretched",
        {**WIDE, **BOX, "start": [BUMP]},
        ["the f-plane is stretched", f"beta Y/|f0| = {1.5e6 / RADIUS:.2g}", "over the sphere"],
    ),
    (
        "plane_stretched",
        {**WIDE, **BOX, "start": [BUMP], "frame.plane": "beta", "frame.latitude": "20 deg"},
        ["the beta-plane is stretched", f"{1.5e6 / RADIUS / math.tan(math.radians(20)):.2g}"],
    ),
    (
        "f_changes_sign",
        {**WIDE, **BOX, "start": [BUMP], "frame.plane": "beta", "frame.latitude": "5 deg"},
        ["f changes its sign", format_quantity(F5_LEAST, "rad/s")],
    ),
    (
        "f_jumps_round",
        {**WIDE, "start": [BUMP], "frame.plane": "beta"},
        ["not periodic along y", format_quantity(2 * OMEGA * math.cos(math.pi / 4) * 3e6 / RADIUS, "rad/s")],
    ),
    # inertial period 2 pi/f, Gill 1982, chapter 8
    (
        "rotation_negligible",
        {"time.until": "5 h", "expect": []},
        ["short against the inertial period", f"{5 * 3600 * F45 / (2 * math.pi):.2g}"],
    ),
    # Rossby number U/(f L), Gill 1982, chapter 7
    (
        "rotation_negligible",
        {"numerics.linear": False, "start": [{"kind": "jet", "speed": 1.0, "width": 5e3, "along": "y"}]},
        ["rotation is weak", f"is {1.0 / (F45 * 5e3):.2g}"],
    ),
    ("elevation_not_small", {"start.0.eta": "20 * sign(x)"}, ["linear equations leave that out", "0.2 of it"]),
    ("elevation_not_small", {"start.0.eta": "20 * sign(x)", "numerics.linear": False}, ["steepen", "0.2 of it"]),
    # Froude number U/c
    (
        "swift_flow",
        {"numerics.linear": False, "start": [{"kind": "formula", "v": 2.0}]},
        ["faster than its waves", f"{2 / C:.2g}"],
    ),
    ("hydrostatic_doubtful", {"start": front(width=1500.0)}, ["hydrostatic", f"H/L = {100 / 1500:.2g}"]),
    # (H/L) cot(latitude): Gerkema et al. 2008, Rev. Geophys. 46
    (
        "traditional_doubtful",
        {"start": front(), "frame.latitude": "2 deg"},
        ["traditional", f"{100 / 2e4 / math.tan(math.radians(2)):.2g}"],
    ),
    (
        "traditional_doubtful",
        {"start": front(width=1e3), "frame": {"plane": "equatorial"}},
        # on the equatorial plane R/a, a = sqrt(c/beta), beta = 2 Omega/R
        ["R/a", f"{100 / 1e3 * RADIUS / math.sqrt(C * RADIUS / (2 * OMEGA)):.2g}"],
    ),
    ("at_rest", {"start": []}, ["nothing will move"]),
    (
        "growing_enstrophy_modes",
        {"numerics.pv_flux": "enstrophy", "layer.depth": "100 + 10 * sin(2 * pi * x / Lx)"},
        ['"enstrophy" has growing modes', "90 m to 110 m"],
    ),
    # a step of 200 s on the 2 c/dx = 2 sqrt(2) c/537 m of the grid: Durran 2010, limit sqrt(3)
    (
        "step_consumed",
        {"time.step": 200.0, "time.until": 3.6e5, "output": {"every": 3600.0, "diagnostics_every": 3600.0}},
        ["uses up its margin", f"{100 * 200 * 2 * math.sqrt(2) * C / (550e3 / 1024) / math.sqrt(3):.3g} %"],
    ),
    (
        "step_consumed",
        {"numerics.linear": False, "time.speed": 0.1, "start": [{"kind": "formula", "v": 0.5}]},
        ["slower than the start", "0.1 m/s", "0.5 m/s"],
    ),
    (
        "said_of_the_start",
        {"start": [{"kind": "vortex", "profile": "shielded", "speed": 0.01, "radius": 4e3, "at": [2.72e5, 0.0]}]},
        ["start.0"],
    ),
]


@pytest.mark.parametrize(("name", "values", "said"), CASES)
def test_a_caution_is_said_with_its_number(name: str, values: dict[str, Any], said: list[str]) -> None:
    text = " | ".join(cautions(name, values))
    assert all(piece in text for piece in said), text


def test_every_caution_has_a_case() -> None:
    # slow_threads depends on the machine and has its own test
    assert {name for name, _, _ in CASES} | {"slow_threads"} == set(CAUTIONS)


@pytest.mark.parametrize("name", CAUTIONS)
def test_no_caution_is_said_of_a_set_up_that_deserves_none(name: str) -> None:
    assert cautions(name) == []


@pytest.mark.parametrize(
    ("name", "values"),
    [
        # the other side of each limit
        ("radius_unresolved", {"grid.cells": [128, 4]}),
        ("start_unresolved", {"start": front(width=2200.0)}),
        ("jump_off_faces", {"start": [{"kind": "step", "amplitude": 0.5, "at": 0.0}]}),
        ("single_precision", {"grid.precision": "single"}),
        ("waves_return", {"time.until": "4.4 day"}),
        ("windows_after_return", {"expect.0.measure.during": ["2.2 day", "3.6 day"]}),
        ("plane_stretched", {**WIDE, **BOX, "start": [BUMP], "grid.size": [1.2e6, 1.2e6]}),
        ("f_changes_sign", {**WIDE, **BOX, "start": [BUMP], "frame": {"plane": "equatorial"}}),
        ("f_jumps_round", {**WIDE, **BOX, "start": [BUMP], "frame.plane": "beta"}),
        ("rotation_negligible", {"time.until": "18 h", "expect": []}),
        ("rotation_negligible", {"frame": {"plane": "none"}, "expect": []}),
        ("elevation_not_small", {"start.0.eta": "9 * sign(x)"}),
        ("hydrostatic_doubtful", {"start": front(width=2100.0)}),
        ("traditional_doubtful", {"start": front(), "frame.latitude": "6 deg"}),
        ("traditional_doubtful", {"start": front(), "frame.latitude": "-6 deg"}),
        ("growing_enstrophy_modes", {"numerics.pv_flux": "enstrophy"}),
        ("growing_enstrophy_modes", {"layer.depth": "100 + 10 * sin(2 * pi * x / Lx)"}),
        ("step_consumed", {"numerics.linear": False, "time.speed": 0.6, "start": [{"kind": "formula", "v": 0.5}]}),
    ],
)
def test_a_caution_is_not_said_beyond_its_limit(name: str, values: dict[str, Any]) -> None:
    assert cautions(name, values) == []


def test_the_southern_hemisphere_gets_the_same_cautions() -> None:
    north = {**WIDE, **BOX, "start": [BUMP], "frame.plane": "beta", "frame.latitude": "20 deg"}
    south = {**north, "frame.latitude": "-20 deg"}
    assert [str(one) for one in outlook(north).cautions] == [str(one) for one in outlook(south).cautions]


def test_a_caution_reads_what_why_and_remedy() -> None:
    assert str(Caution("a", "b", "c")) == "a; b; c"
    assert Caution.from_text("a; b; c") == Caution("a", "b", "c")
    assert Caution.from_text("a; b") == Caution("a", "", "b")
    assert Caution.from_text("a; b1; b2; c") == Caution("a", "b1; b2", "c")
    assert str(Caution.from_text("a")) == "a"


@pytest.mark.parametrize(("name", "values", "said"), CASES)
def test_every_caution_says_what_and_why(name: str, values: dict[str, Any], said: list[str]) -> None:
    for caution in CAUTIONS[name](facts(values)):
        assert caution.what
        assert caution.why or name == "said_of_the_start"
        assert caution.remedy


def test_threads_without_openmp_are_told_where_the_compiler_is_loaded_anyway(monkeypatch: pytest.MonkeyPatch) -> None:
    importlib.import_module("numba")
    known = importlib.import_module

    def without(name: str, package: str | None = None) -> Any:
        if name.endswith("omppool"):
            raise ImportError(name)
        return known(name, package)

    monkeypatch.setattr(importlib, "import_module", without)
    assert re.search("libgomp", " ".join(cautions("slow_threads", {"numerics.threads": 2})))
    assert cautions("slow_threads", {"numerics.threads": 1}) == []


# --------------------------------------------------------------------------------------------------- waves that return


def test_waves_begin_where_the_start_is_out_of_balance() -> None:
    dx = 550e3 / 1024
    low, high = source(facts({"start": [{"kind": "step", "amplitude": 0.5, "at": -1e5}]}), "x")
    # differences over two cells smear the jump over one cell to either side
    assert -1e5 - 1.5 * dx <= low <= high <= -1e5 + 1.5 * dx


def test_waves_are_back_from_the_nearer_wall_first() -> None:
    dx = 550e3 / 1024
    known = facts({"start": [{"kind": "step", "amplitude": 0.5, "at": -1e5}]})
    # there and back over the 175 km to the west wall; the place is known to a cell and a half
    assert return_time(known, "x") == pytest.approx(2 * 175e3 / C, abs=3 * dx / C)
    # at the wall itself once over them
    assert return_time(known, "x", (-275e3, -275e3)) == pytest.approx(175e3 / C, abs=3 * dx / C)


def test_waves_from_the_walls_reach_five_radii_after_3_9_days() -> None:
    # by hand: out 275 km to the wall and in again to 70 km, at 1.414 m/s; the jump is known to a cell and a half
    back = return_time(facts(), "x", (0.0, 70e3))
    assert back == pytest.approx((550e3 - 70e3) / C, abs=1.5 * 550e3 / 1024 / C)
    assert back / 86400 == pytest.approx(3.9, abs=0.05)


def test_waves_come_round_a_periodic_direction_the_long_way_to_a_place_beside() -> None:
    known = facts(
        {"start": [{"kind": "bump", "amplitude": 0.5, "radius": 1e4}], **PERIODIC, "grid.size": [550e3, 550e3]}
    )
    assert return_time(known, "x") == pytest.approx(550e3 / C)
    # the bump is even in x, so that its middle is known to a cell
    assert return_time(known, "x", (1e5, 1e5)) == pytest.approx(450e3 / C, abs=550e3 / 1024 / C)


def test_a_direction_in_which_nothing_varies_is_left_out() -> None:
    assert facts().varying == ("x",)
    assert facts({"frame.plane": "beta", "edges.south": "wall", "edges.north": "wall"}).varying == ("x", "y")
    assert facts({"layer.depth": "100 + y/1000"}).varying == ("x", "y")
    jet = [{"kind": "jet", "speed": 0.1, "width": 1e5, "along": "y"}]
    # what the balance leaves along the jet is round-off
    assert facts({"start": jet}).varying == ("x",)


def test_modes_of_the_domain_are_meant_to_come_round() -> None:
    wave = {"kind": "poincare_wave", "amplitude": 0.1, "waves": [4, 0]}
    values = {**PERIODIC, "start": [wave], "time.until": "30 day", "output": {"every": "0.5 day"}, "expect": []}
    assert cautions("waves_return", values) == []
    # with a hill beside them the hill's own waves do come round
    assert cautions("waves_return", {**values, "start": [wave, BUMP]})


def test_of_a_balanced_start_it_is_said_that_it_sends_out_few_waves() -> None:
    vortex = {"kind": "vortex", "profile": "shielded", "speed": 0.01, "radius": 3e4}
    values = {"grid.cells": [64, 64], "grid.size": [5e5, 5e5], "start": [vortex], "time.until": "20 day"}
    assert "sends out few" in cautions("waves_return", values)[0]
    assert "sends out few" not in cautions("waves_return", {**values, "start": [{**vortex, "balance": "none"}]})[0]
    assert cautions("windows_after_return", values) == []


def test_a_conserved_quantity_does_not_mind_waves_that_return() -> None:
    change = {"kind": "change", "of": "mass"}
    expect = {"expect.0.measure": change, "expect.0.value": 0, "expect.0.within": 1e-12}
    assert cautions("windows_after_return", {"time.until": "9 day", **expect}) == []


# ------------------------------------------------------------------------------------------------------------ rounding


def test_single_precision_errs_by_what_is_said_of_it() -> None:
    from swmodel.outlook.resolution import single_precision_error

    # a plane rotation by a rounded angle, ten thousand times, rounded each time: as rounded coefficients do to a wave
    steps, angle = 10_000, 0.5432109876
    turn = np.array([[math.cos(angle), -math.sin(angle)], [math.sin(angle), math.cos(angle)]])
    single, double = np.array([1, 0], np.float32), np.array([1.0, 0.0])
    rounded = turn.astype(np.float32)
    for _ in range(steps):
        single, double = rounded @ single, turn @ double
    error = float(np.abs(single - double).max())
    # an estimate, within a factor of ten either way
    assert 0.1 < single_precision_error(steps) / error < 10
