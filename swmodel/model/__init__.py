"""The model room: the one place that runs the chain from settings to a judged run."""

from .model import Model
from .running import Progress, judge, resume, run

__all__ = ["Model", "Progress", "judge", "resume", "run"]
