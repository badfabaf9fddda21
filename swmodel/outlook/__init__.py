"""The outlook room: what `check` says before anything runs, the plan of a run, and what runs really cost."""

from .cautions import CAUTIONS, Caution
from .cost import remember_run
from .outlook import Outlook, check
from .plan import Plan, make_plan
from .speeds import measure_speed

__all__ = ["CAUTIONS", "Caution", "Outlook", "Plan", "check", "make_plan", "measure_speed", "remember_run"]
