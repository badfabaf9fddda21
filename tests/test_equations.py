"""docs/equations.md numbers the equations; docstrings cite them."""

from __future__ import annotations

import ast
import re
from pathlib import Path

import pytest

import swmodel
from swmodel.dynamics import PV_FLUXES
from swmodel.steppers import STEPPERS

PACKAGE = Path(swmodel.__file__).parent
PAGE = (PACKAGE.parent / "docs" / "equations.md").read_text("utf-8")
NUMBERED = {int(number) for number in re.findall(r"^    .*\S\s+\((\d+)\)$", PAGE, re.MULTILINE)}
CITED = re.compile(r"\bequations?\s+(\d+)(?:\s+to\s+(\d+))?", re.IGNORECASE)
AT_LINE_END = re.compile(r"\s{2,}\((\d+)\)$", re.MULTILINE)


def citations():
    """Numbers that docstrings cite, with the files that do."""
    found = {}
    for path in sorted(PACKAGE.rglob("*.py")):
        name = path.relative_to(PACKAGE).as_posix()
        for node in ast.walk(ast.parse(path.read_text("utf-8"))):
            if isinstance(node, ast.Module | ast.ClassDef | ast.FunctionDef):
                text = ast.get_docstring(node) or ""
                ranges = [(int(low), int(high or low)) for low, high in CITED.findall(text)]
                ranges += [(int(number), int(number)) for number in AT_LINE_END.findall(text)]
                for low, high in ranges:
                    for number in range(low, high + 1):
                        found.setdefault(number, set()).add(name)
    return found


def test_every_equation_that_a_docstring_cites_is_on_the_page():
    assert set(citations()) <= NUMBERED


def test_every_equation_on_the_page_is_cited_where_it_is_computed():
    assert sorted(NUMBERED) == list(range(1, 9))
    where = citations()
    for number, file in (
        *((n, "dynamics/kernels.py") for n in (1, 2, 3)),
        *((n, "dynamics/reference.py") for n in (1, 2, 3, 4, 5, 6)),
        *((n, "dynamics/pv_flux.py") for n in (4, 5, 6)),
        (7, "steppers.py"),
        (8, "diagnostics/budgets.py"),
    ):
        assert file in where[number]


def test_the_page_names_every_flux_and_stepper():
    for name in (*PV_FLUXES, *STEPPERS):
        assert f"`{name}`" in PAGE


@pytest.mark.parametrize("name", PV_FLUXES)
def test_the_page_says_of_each_flux_what_the_table_claims(name):
    words = [
        "yes" if kept else "no" for kept in (PV_FLUXES[name].conserves_energy, PV_FLUXES[name].conserves_enstrophy)
    ]
    assert f"| `{name}` | {words[0]} | {words[1]} |" in PAGE
