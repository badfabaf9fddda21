"""What all tests share.

Compiled kernels are kept in the cache folder of whoever runs the tests (`swmodel.dynamics.cache`): all workers share
it, and a second run compiles nothing.
"""

from __future__ import annotations

import pytest
from hypothesis import settings
from stepped import STEP

from swmodel.outlook import speeds

# a first example may compile for some 15 s; the same examples every time, so that a green suite stays green
settings.register_profile("suite", deadline=None, derandomize=True)
settings.load_profile("suite")


@pytest.fixture(scope="session", autouse=True)
def speeds_of_their_own():
    """Keep how long the tests took out of the estimates that their user sees."""
    before, speeds.FILE = speeds.FILE, "speed-of-tests.json"
    yield
    speeds.FILE = before


@pytest.fixture
def step(tmp_path):
    """A configuration on disk."""
    path = tmp_path / "step.toml"
    path.write_text(STEP)
    return path
