"""The state room: u, v, eta in time; what a run may start from; balance on this grid."""

from .balance import BalanceTendency
from .build import StartFields, build_start
from .starts import STARTS, OwnStart, Start, StartSettings
from .state import State

__all__ = ["STARTS", "BalanceTendency", "OwnStart", "Start", "StartFields", "StartSettings", "State", "build_start"]
