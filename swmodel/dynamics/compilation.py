"""How kernels are compiled, and where the compiled ones are kept.

The disk cache of numba notices neither an edited point function nor an edited constant that an outer kernel took in.
So the cache folder is named by a hash of the kernel sources: an edit never meets an old answer
(closed by ``test_compilation.py``). This module must be imported before any kernel.
"""

from __future__ import annotations

import hashlib
from pathlib import Path
from typing import Any

import numba
import numpy as np
from numba import njit

from .cache import cache_folder

# contraction and reciprocals are allowed, reassociation is not: results must not depend on the band of rows
FAST = {"contract", "arcp", "nsz"}
OPTIONS: dict[str, Any] = {"fastmath": FAST, "error_model": "numpy"}
INLINED: dict[str, Any] = {"jit_options": {"forceinline": True, **OPTIONS}}
row_jit = njit(forceinline=True, **OPTIONS)

# Unsigned indices: a signed one makes LLVM test for wrap-around, and the loop stays scalar (measured: 4.8 times slower)
U8 = np.uint64
ONE = np.uint64(1)

PACKAGE = Path(__file__).parent.parent
# every file that a compiled function, or a constant in one, stands in
KERNEL_SOURCES = (
    "dynamics/compilation.py",
    "dynamics/edges.py",
    "dynamics/kernels.py",
    "dynamics/pv_flux.py",
    "dynamics/schemes.py",
    "dynamics/sweeps.py",
    "diagnostics/budgets.py",
    "diagnostics/sums.py",
    "grid/domain.py",
)


def source_digest(package: Path = PACKAGE) -> str:
    """Digest of every kernel source and of the versions that compile it."""
    digest = hashlib.sha256(f"{numba.__version__} {np.__version__}".encode())
    for name in KERNEL_SOURCES:
        digest.update(name.encode() + (package / name).read_bytes())
    return digest.hexdigest()[:16]


_config: Any = numba.config
_config.CACHE_DIR = str(cache_folder() / "kernels" / source_digest())
