"""What each PV flux keeps in space: rates of change of energy and potential enstrophy of random states."""

from __future__ import annotations

import numpy as np
import pytest
from flows import Combination, plain_of
from rates import ROUND_OFF, energy_rates, enstrophy_rates, relative, states

from swmodel.dynamics import PV_FLUXES

# a rate that is not conserved shows: random states lose shares of order one, averaged over some hundred cells
LOST = 1e-3


@pytest.mark.parametrize("linear", [False, True], ids=["full", "linear"])
@pytest.mark.parametrize("name", [name for name, flux in PV_FLUXES.items() if flux.conserves_energy])
def test_energy_stays_on_every_domain(name, linear):
    # Sadourny 1975; Arakawa & Lamb 1981: on 100 random states over rough depth, f varying in x and y
    of = Combination(name, "uneven", "field", linear, "double")
    for basin, fields in states(of, 100):
        rates = plain_of(basin, of).tendency(*fields)
        assert relative(energy_rates(basin, fields, rates, linear)) < ROUND_OFF


@pytest.mark.parametrize("name", [name for name, flux in PV_FLUXES.items() if flux.conserves_enstrophy])
def test_potential_enstrophy_stays_on_doubly_periodic_domains(name):
    # Sadourny 1975; Arakawa & Lamb 1981
    of = Combination(name, "uneven", "field", False, "double")
    for basin, fields in states(of, 100, ("periodic",)):
        rates = plain_of(basin, of).tendency(*fields)
        assert relative(enstrophy_rates(basin, fields, rates)) < ROUND_OFF


def test_what_is_not_promised_is_not_kept():
    # so the sums above can fail: `energy` loses potential enstrophy, `enstrophy` energy
    for name, edges, terms in (
        ("energy", "periodic", enstrophy_rates),
        ("enstrophy", "periodic", lambda basin, fields, rates: energy_rates(basin, fields, rates, False)),
    ):
        of = Combination(name, "uneven", "field", False, "double")
        lost = []
        for basin, fields in states(of, 20, (edges,), least=8):
            lost.append(relative(terms(basin, fields, plain_of(basin, of).tendency(*fields))))
        assert np.median(lost) > LOST
