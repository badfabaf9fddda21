"""Where each key of a TOML text stands.

TOML readers keep the place of a syntax error, but of no valid key. This finds every key and value of a text that the
reader has already accepted, and so needs to know little of the grammar.
"""

from __future__ import annotations

import re
from collections.abc import Sequence

import tomli

_BLANK = re.compile(r"(?:[ \t\r\n]|#[^\n]*)*")
_SPACE = re.compile(r"[ \t]*")
_KEY = re.compile(r'"(?:\\.|[^"\\\n])*"|\'[^\'\n]*\'|[A-Za-z0-9_-]+')
_SCALAR = re.compile(
    r'"""(?:\\.|"{1,2}(?!")|[^"\\])*"{3,5}'  # text over several lines
    r"|'''(?:'{1,2}(?!')|[^'])*'{3,5}"
    r'|"(?:\\.|[^"\\\n])*"'
    r"|'[^'\n]*'"
    r"|\d{4}-\d\d-\d\d \d\d:[^,\]}#\s]*"  # a date and time with a blank between
    r"|[^,\]}#\s]+",
    re.DOTALL,
)

Path = tuple[str | int, ...]


class Places:
    r"""Line and column of every key and list item of an accepted TOML text.

    Parameters
    ----------
    text : str
        The text; ``\r\n`` counts as one character.
    """

    def __init__(self, text: str) -> None:
        self._text = text.replace("\r\n", "\n")
        self._found: dict[Path, int] = {}
        self._lists: dict[Path, int] = {}
        self._read()

    def where(self, path: Sequence[str | int]) -> tuple[int, int] | None:
        """Return line and column, from 1, of a path or its nearest ancestor that stands in the text; None without one.

        Parameters
        ----------
        path : sequence of str and int
            Keys, and numbers of list items from 0.
        """
        path = tuple(path)
        while path and path not in self._found:
            path = path[:-1]
        if not path:
            return None
        at = self._found[path]
        return self._text.count("\n", 0, at) + 1, at - self._text.rfind("\n", 0, at)

    def _read(self) -> None:
        """Walk the text statement by statement."""
        at, table = self._past_blank(0), Path()
        while at < len(self._text):
            if self._text[at] == "[":
                table, at = self._header(at)
            else:
                at = self._pair(table, at)
            at = self._past_blank(at)

    def _header(self, at: int) -> tuple[Path, int]:
        """Read ``[a.b]`` or ``[[a.b]]``: the path that the keys below it have, and the end."""
        is_list = self._text.startswith("[[", at)
        parts, at = self._key(at + 1 + is_list)
        table = Path()
        for number, (name, place) in enumerate(parts):
            table += (name,)
            last = number == len(parts) - 1
            self._found.setdefault(table, place)
            if is_list and last:
                self._lists[table] = self._lists.get(table, -1) + 1
            if table in self._lists:
                table += (self._lists[table],)
                self._found.setdefault(table, place)
            elif last:
                self._found[table] = place  # a table may be opened after its subtables
        if is_list:  # lists inside a new item count anew
            for inner in [path for path in self._lists if len(path) > len(table) and path[: len(table)] == table]:
                del self._lists[inner]
        return table, at + 1 + is_list

    def _pair(self, table: Path, at: int) -> int:
        """Read ``key = value``; returns the end."""
        parts, at = self._key(at)
        path = table
        for name, place in parts:
            path += (name,)
            self._found.setdefault(path, place)
        return self._value(path, self._past_space(at + 1))

    def _value(self, path: Path, at: int) -> int:
        """Read a value, a list's and inline table's items included; returns the end."""
        opening = self._text[at]
        if opening not in "[{":
            return self._past(_SCALAR, at)
        at, number = self._past_blank(at + 1), 0
        while self._text[at] not in "]}":
            if opening == "[":
                self._found[(*path, number)] = at
                at = self._value((*path, number), at)
            else:
                at = self._pair(path, at)
            at, number = self._past_blank(at), number + 1
            if self._text[at] == ",":
                at = self._past_blank(at + 1)
        return at + 1

    def _key(self, at: int) -> tuple[list[tuple[str, int]], int]:
        """Read a dotted key: its parts, each with its place, and the end."""
        parts = []
        while True:
            at = self._past_space(at)
            end = self._past(_KEY, at)
            raw = self._text[at:end]
            parts.append((tomli.loads(f"key = {raw}")["key"] if raw[0] in "\"'" else raw, at))
            at = self._past_space(end)
            if self._text[at : at + 1] != ".":
                return parts, at
            at += 1

    def _past(self, pattern: re.Pattern[str], at: int) -> int:
        """End of what must stand here in an accepted text."""
        match = pattern.match(self._text, at)
        assert match is not None, "the text was not accepted by the reader"
        return match.end()

    def _past_blank(self, at: int) -> int:
        return self._past(_BLANK, at)

    def _past_space(self, at: int) -> int:
        return self._past(_SPACE, at)
