"""run.log: what happened in a run, with UTC times."""

from __future__ import annotations

import logging
import time
from pathlib import Path

from ..errors import CAUTION
from .durable import machine_errors

LOG = "run.log"


class _LogFile(logging.FileHandler):
    """A log that a full disk silences: what is being stored reports that, and stops the run."""

    def handleError(self, record: logging.LogRecord) -> None:  # noqa: N802  (logging's name)
        """Let the line go."""


def open_log(folder: Path) -> logging.Handler:
    """Send what the package logs to the run's log as well; the first line of a new one is the caution.

    Parameters
    ----------
    folder : Path
        The run's folder.

    Returns
    -------
    logging.Handler
        For `close_log`.
    """
    path = folder / LOG
    with machine_errors(path):
        handler = _LogFile(path, mode="a", encoding="utf-8")
    layout = logging.Formatter("%(asctime)sZ %(levelname)-7s %(message)s", datefmt="%Y-%m-%dT%H:%M:%S")
    layout.converter = time.gmtime
    handler.setFormatter(layout)
    logger = logging.getLogger("swmodel")
    logger.addHandler(handler)
    logger.setLevel(min(logger.level or logging.INFO, logging.INFO))
    if path.stat().st_size == 0:
        logger.info(CAUTION)
    return handler


def close_log(handler: logging.Handler) -> None:
    """Stop sending to a run's log."""
    logging.getLogger("swmodel").removeHandler(handler)
    try:
        handler.close()
    except OSError:  # what it still held did not fit on a full disk, which was reported already
        return
