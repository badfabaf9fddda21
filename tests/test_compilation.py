"""Compiled kernels: where they are kept, that an edit is noticed, and that they hide nothing."""

from __future__ import annotations

import ast
import importlib
import math
import os
import shutil
import subprocess
import sys
import textwrap
from pathlib import Path

import numba
import numpy as np
import pytest
from flows import FULL, equations_of, make_basin, make_state, random_flow
from numba.core.registry import CPUDispatcher

import swmodel
from swmodel.dynamics import compilation
from swmodel.dynamics.compilation import FAST, KERNEL_SOURCES, source_digest
from swmodel.dynamics.tendency import EULER

PACKAGE = Path(swmodel.__file__).parent
FILES = sorted(path.relative_to(PACKAGE).as_posix() for path in PACKAGE.rglob("*.py"))


def module_name(file):
    return ".".join(("swmodel", *Path(file).with_suffix("").parts)).removesuffix(".__init__")


def kernels():
    """Every compiled function of the package, by name."""
    found = {}
    for file in KERNEL_SOURCES:
        module = importlib.import_module(module_name(file))
        found |= {
            f"{file}:{name}": item
            for name, item in vars(module).items()
            if isinstance(item, CPUDispatcher) and item.py_func.__module__ == module.__name__
        }
    return found


def mentions_numba(file):
    tree = ast.parse((PACKAGE / file).read_text("utf-8"))
    modules = {node.module or "" for node in ast.walk(tree) if isinstance(node, ast.ImportFrom)}
    names = {alias.name for node in ast.walk(tree) if isinstance(node, ast.ImportFrom) for alias in node.names}
    return any(module.split(".")[0] == "numba" for module in modules) or "row_jit" in names


def test_every_file_with_compiled_code_is_under_the_digest():
    # a file left out could be edited and still meet its old machine code
    assert {file for file in FILES if mentions_numba(file)} <= set(KERNEL_SOURCES)
    assert len(kernels()) > 20


@pytest.mark.parametrize("file", KERNEL_SOURCES)
def test_constants_of_kernels_come_from_files_under_the_digest(file):
    # numba freezes a global into the code: one from another file would be edited unnoticed
    module = importlib.import_module(module_name(file))
    tree = ast.parse((PACKAGE / file).read_text("utf-8"))
    origin = {}
    for node in ast.walk(tree):
        if isinstance(node, ast.ImportFrom) and node.level:
            home = module.__name__.split(".")[: -node.level]
            target = (*home, *(node.module.split(".") if node.module else ()))
            origin |= {alias.asname or alias.name: "/".join(target[1:]) + ".py" for alias in node.names}
    for name, kernel in kernels().items():
        if name.startswith(f"{file}:"):
            for used in set(kernel.py_func.__code__.co_names) & set(origin):
                assert origin[used] in KERNEL_SOURCES, f"{name} uses {used}"


@pytest.mark.parametrize("name", kernels())
def test_kernels_hide_no_state(name):
    # what a kernel uses comes in as an argument: its globals are functions, modules and named numbers alone
    code = kernels()[name].py_func.__code__
    for used in code.co_names:
        value = kernels()[name].py_func.__globals__.get(used)
        allowed = value is None or callable(value) or isinstance(value, int | float | np.integer) or value in (np, math)
        assert allowed, f"{used} = {value!r}"
    assert code.co_freevars == ()


@pytest.mark.parametrize("name", kernels())
def test_kernels_may_contract_and_never_reassociate(name):
    # reassociation would let sums depend on the band of rows, and `nnan` would blind the guard against NaN
    options = kernels()[name].targetoptions
    assert options["fastmath"] == FAST
    assert {"reassoc", "fast", "nnan", "ninf"}.isdisjoint(FAST)
    assert options["error_model"] == "numpy"


def test_compiled_kernels_are_kept_in_the_folder_of_their_digest():
    assert Path(numba.config.CACHE_DIR).name == source_digest()
    kept = [path for kernel in kernels().values() if (path := kernel.stats.cache_path)]
    assert len(kept) > 5
    assert all(Path(path).is_relative_to(numba.config.CACHE_DIR) for path in kept)


def copied(folder):
    shutil.copytree(PACKAGE, folder / "swmodel", ignore=shutil.ignore_patterns("__pycache__"))
    return folder / "swmodel"


@pytest.mark.parametrize("file", KERNEL_SOURCES)
def test_an_edit_of_a_kernel_source_gets_another_folder_and_its_undoing_the_old_one(file, tmp_path):
    package = copied(tmp_path)
    before = source_digest(package)
    text = (package / file).read_text("utf-8")
    (package / file).write_text(text + "\n", "utf-8")
    assert source_digest(package) != before
    (package / file).write_text(text, "utf-8")
    assert source_digest(package) == before


def test_another_version_of_the_compiler_gets_another_folder(monkeypatch):
    before = source_digest()
    monkeypatch.setattr(compilation.numba, "__version__", "0.0")
    assert source_digest() != before


@pytest.mark.slow
def test_after_an_edit_the_answer_is_the_edited_one(tmp_path):
    # the trap itself: gravity doubled in a function that the outermost kernel calls through four others
    package = copied(tmp_path)
    script = textwrap.dedent(
        """
        import numpy as np
        from swmodel.dynamics import PV_FLUXES
        from swmodel.dynamics.tendency import Equations
        from swmodel.frame import FrameSettings, build_frame
        from swmodel.grid import Basin, Grid
        grid = Grid(4, 2, 1.0, 1.0, 0.0, 0.0)
        basin = Basin(grid, build_frame(FrameSettings(plane="none"), 0.0), 1.0, 1.0, 1.0)
        eta = np.broadcast_to([0.0, 1.0, 0.0, 0.0], (2, 4))
        du, _, _ = Equations(basin, PV_FLUXES["both"], linear=True).tendency(np.zeros((2, 5)), np.zeros((3, 4)), eta)
        print(du[0, 1])
        """
    )
    environment = os.environ | {"SWMODEL_CACHE": str(tmp_path / "cache"), "PYTHONPATH": str(tmp_path)}

    def answer():
        done = subprocess.run(
            [sys.executable, "-c", script], env=environment, cwd=tmp_path, capture_output=True, text=True, check=True
        )
        return float(done.stdout)

    assert answer() == -1.0
    kernel = package / "dynamics" / "kernels.py"
    text = kernel.read_text("utf-8")
    edited = text.replace("    return gravity * eta[i]", "    return (gravity + gravity) * eta[i]")
    assert edited != text
    kernel.write_text(edited, "utf-8")
    assert answer() == -2.0
    kernel.write_text(text, "utf-8")
    assert answer() == -1.0


def test_the_guard_sees_a_value_that_is_not_finite():
    # `fastmath=True` would make isnan answer False; ghosts and padding do not count
    from swmodel.diagnostics.sums import row_health

    basin = make_basin(9, 7)
    equations = equations_of(basin, FULL)
    setup = equations.setup(EULER, 1.0)
    fields = random_flow(np.random.default_rng(1), basin.grid)
    healthy = row_health(make_state(equations, fields).sets[0:3], setup)
    np.testing.assert_array_equal(healthy, 1 + fields[2].min(1))
    for field in range(3):
        for value in (np.nan, np.inf, -np.inf):
            state = make_state(equations, fields)
            (state.u, state.v, state.eta)[field][4, 3] = value
            sick = row_health(state.sets[0:3], setup)
            assert sick[4] == -np.inf
            assert np.array_equal(np.delete(sick, 4), np.delete(healthy, 4))
