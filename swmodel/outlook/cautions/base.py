"""What a caution is.

To write another: a function of the `Facts` in one file of this folder that yields a `Caution` where it applies, and its
row in the table `CAUTIONS`. Its docstring says what it is about. Limits stand as constants, with their reason.
"""

from __future__ import annotations

from dataclasses import dataclass


@dataclass(frozen=True)
class Caution:
    """Something to take a result with.

    Parameters
    ----------
    what : str
        What is doubtful.
    why : str
        Why here, with the number.
    remedy : str
        What to do; may be empty.
    """

    what: str
    why: str = ""
    remedy: str = ""

    def __str__(self) -> str:
        return "; ".join(part for part in (self.what, self.why, self.remedy) if part)

    @classmethod
    def from_text(cls, text: str) -> Caution:
        """Read "what; why here, with the number; remedy"; the middle may itself hold semicolons, or be missing."""
        what, *rest = text.split("; ")
        return cls(what, "; ".join(rest[:-1]), rest[-1] if rest else "")
