"""The house stands as DEVELOPERS.md draws it: imports go up the page only, tables are what settings read."""

from __future__ import annotations

import ast
import subprocess
import sys
from pathlib import Path

import pytest

import swmodel

PACKAGE = Path(swmodel.__file__).parent
ROOMS = (
    "errors",
    "choices",
    "quantities",
    "fields",
    "frame",
    "grid",
    "theory",
    "state",
    "dynamics",
    "steppers",
    "store",
    "diagnostics",
    "measures",
    "settings",
    "outlook",
    "model",
    "studies",
    "pictures",
    "cli",
)
FILES = sorted(path for path in PACKAGE.rglob("*.py") if path.parent != PACKAGE or path.name != "__init__.py")


def rooms_imported(path: Path) -> set[str]:
    """Rooms that the imports of a file reach, those for type checking alone left out."""
    parts = ("swmodel", *path.relative_to(PACKAGE).with_suffix("").parts)
    found = set()
    tree = ast.parse(path.read_text("utf-8"))
    for block in [
        node for node in ast.walk(tree) if isinstance(node, ast.If) and "TYPE_CHECKING" in ast.dump(node.test)
    ]:
        block.body = []
    for node in ast.walk(tree):
        if isinstance(node, ast.ImportFrom):
            base = parts[: len(parts) - node.level] if node.level else ()
            target = (*base, *(node.module.split(".") if node.module else ()))
            if target[:1] == ("swmodel",):
                found |= {target[1]} if len(target) > 1 else {alias.name for alias in node.names}
    return found & set(ROOMS)


@pytest.mark.parametrize("path", FILES, ids=lambda path: str(path.relative_to(PACKAGE)))
def test_imports_go_only_upstream(path):
    room = path.relative_to(PACKAGE).parts[0].removesuffix(".py")
    here = ROOMS.index(room)
    for other in rooms_imported(path):
        assert ROOMS.index(other) <= here, f"{path.name} of {room} imports from {other}, which lies downstream"


def test_theory_and_dynamics_never_meet():
    for path in FILES:
        room = path.relative_to(PACKAGE).parts[0]
        if room == "theory":
            assert "dynamics" not in rooms_imported(path)
        if room == "dynamics":
            assert "theory" not in rooms_imported(path)


def test_the_plain_equations_import_nothing_of_ours():
    assert rooms_imported(PACKAGE / "dynamics" / "reference.py") == set()


def test_the_package_shows_just_its_public_names():
    assert sorted(swmodel.__all__) == [
        "Experiment",
        "MachineError",
        "Model",
        "Outlook",
        "RequestError",
        "Run",
        "SolutionError",
        "SwmodelError",
        "Verdict",
        "check",
        "judge",
        "read",
        "run",
    ]
    for name in swmodel.__all__:
        assert getattr(swmodel, name).__doc__


@pytest.mark.parametrize("words", [["--help"], ["check", "--help"], ["run", "--help"], ["--version"]])
def test_help_waits_for_nothing_heavy(words):
    code = (
        "import sys, contextlib, io\nfrom swmodel.cli import main\n"
        "with contextlib.redirect_stdout(io.StringIO()), contextlib.suppress(SystemExit):\n"
        f"    main({words!r})\n"
        "print(sorted({'numba', 'numpy', 'scipy', 'h5py', 'pydantic', 'pint', 'rich'} & set(sys.modules)))"
    )
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True)
    assert done.stdout.strip() == "[]"


def test_check_loads_neither_compiler_nor_plots(tmp_path):
    code = (
        "import sys\nimport swmodel\n"
        f"print(swmodel.check(swmodel.read({str(PACKAGE.parent / 'configs' / 'front.toml')!r})))\n"
        "print(sorted({'numba', 'matplotlib'} & set(sys.modules)))"
    )
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True)
    assert done.stdout.strip().splitlines()[-1] == "[]"
