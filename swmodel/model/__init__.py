"""The model room: the one place that runs the chain from settings to a judged run."""

from .course import Progress
from .model import Model
from .running import judge, resume, run

__all__ = ["Model", "Progress", "judge", "resume", "run"]
