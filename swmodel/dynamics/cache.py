"""Where compiled kernels and measured speeds are kept. Loads no compiler: `check` asks for it too."""

from __future__ import annotations

import logging
import os
import tempfile
from pathlib import Path

log = logging.getLogger(__name__)


def cache_folder() -> Path:
    """Return the folder for compiled kernels and measured speeds.

    ``$SWMODEL_CACHE``, else ``$XDG_CACHE_HOME/swmodel``, else ``~/.cache/swmodel``, else a temporary one (logged).
    """
    wanted = os.environ.get("SWMODEL_CACHE")
    base = os.environ.get("XDG_CACHE_HOME") or os.path.expanduser("~/.cache")  # noqa: PTH111  (may have no home)
    folder = Path(wanted) if wanted else Path(base) / "swmodel"
    try:
        folder.mkdir(parents=True, exist_ok=True)
        with tempfile.TemporaryFile(dir=folder):
            return folder
    except OSError as error:
        fallback = Path(tempfile.gettempdir()) / f"swmodel-{os.getuid() if hasattr(os, 'getuid') else 'cache'}"
        fallback.mkdir(parents=True, exist_ok=True)
        log.info("cache folder %s cannot be written (%s): using %s", folder, error, fallback)
        return fallback
