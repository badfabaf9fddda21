"""What a set-up should be taken with: one function a caution, and their table. How to add one stands in `base`."""

from __future__ import annotations

from collections.abc import Callable, Iterator

from ..facts import Facts
from .base import Caution
from .numerics import growing_enstrophy_modes, said_of_the_start, slow_threads, step_consumed
from .physics import at_rest, elevation_not_small, hydrostatic_doubtful, swift_flow, traditional_doubtful
from .plane import f_changes_sign, f_jumps_round, plane_stretched, rotation_negligible
from .resolution import jump_off_faces, radius_unresolved, single_precision, start_unresolved
from .returning import waves_return, windows_after_return

__all__ = ["CAUTIONS", "Caution", "gather"]


def gather(facts: Facts) -> list[Caution]:
    """Return every caution that applies."""
    return [caution for row in CAUTIONS.values() for caution in row(facts)]


CAUTIONS: dict[str, Callable[[Facts], Iterator[Caution]]] = {
    "radius_unresolved": radius_unresolved,
    "start_unresolved": start_unresolved,
    "jump_off_faces": jump_off_faces,
    "single_precision": single_precision,
    "waves_return": waves_return,
    "windows_after_return": windows_after_return,
    "plane_stretched": plane_stretched,
    "f_changes_sign": f_changes_sign,
    "f_jumps_round": f_jumps_round,
    "rotation_negligible": rotation_negligible,
    "elevation_not_small": elevation_not_small,
    "swift_flow": swift_flow,
    "hydrostatic_doubtful": hydrostatic_doubtful,
    "traditional_doubtful": traditional_doubtful,
    "at_rest": at_rest,
    "growing_enstrophy_modes": growing_enstrophy_modes,
    "step_consumed": step_consumed,
    "slow_threads": slow_threads,
    "said_of_the_start": said_of_the_start,
}
