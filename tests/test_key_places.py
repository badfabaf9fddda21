"""The key locator: where every key and list item of a TOML text stands."""

from __future__ import annotations

from typing import Any

import pytest
import tomli
from configurations import FRONT
from hypothesis import given, settings
from hypothesis import strategies as st

from swmodel.settings.locate import Places

SCALARS = [
    "1",
    "-2.5e3",
    "0x1F",
    "true",
    "inf",
    '""',
    '"text # no comment ] } , = [x]"',
    '"a \\"quoted\\" word"',
    "'C:\\no escape'",
    '"""several\nlines = "with" # signs ""\nand more"""',
    '"""ends in quotes"""""',
    "'''several\n'lines' ''\nmore'''",
    "2000-01-01",
    "2000-01-01 12:00:00",
    "2000-01-01T12:00:00Z",
    "12:00:00",
    "[]",
    "{}",
]
NAMES = [("{}", "k{}"), ('"{}"', "k.{}"), ("'{}'", "k#{}"), ('"{}"', "k = [{}]"), ('"{}"', "\u00e9{}"), ("{}", "1{}")]
GAPS = ["", "", "\n", "# [no.table] x = 1\n", "   \n\t\n"]


class Writer:
    """Writes a random document and notes where it puts each key; the notes are what the locator must find."""

    def __init__(self, data: st.DataObject) -> None:
        self.data = data
        self.text = ""
        self.places: dict[tuple[str | int, ...], tuple[int, int]] = {}
        self.number = 0

    def pick(self, values: list[Any]) -> Any:
        return self.data.draw(st.sampled_from(values))

    def put(self, text: str) -> None:
        self.text += text

    def note(self, path: tuple[str | int, ...]) -> None:
        self.places.setdefault(path, (self.text.count("\n") + 1, len(self.text) - self.text.rfind("\n")))

    def key(self, path: tuple[str | int, ...], parts: int) -> tuple[str | int, ...]:
        """Write a dotted key of new names."""
        for part in range(parts):
            quote, name = self.pick(NAMES)
            self.number += 1
            name = name.format(self.number)
            if part:
                self.put(self.pick([".", " . ", ".\t"]))
            path = (*path, name)
            self.note(path)
            self.put(quote.format(name))
        return path

    def value(self, path: tuple[str | int, ...], depth: int) -> None:
        kind = self.pick(["scalar", "list", "table"]) if depth else "scalar"
        if kind == "scalar":
            self.put(self.pick(SCALARS))
        elif kind == "list":
            self.put("[")
            for item in range(self.data.draw(st.integers(0, 3))):
                self.put(self.pick(["", " ", "\n  ", " # ], x\n"]))
                self.note((*path, item))
                self.value((*path, item), depth - 1)
                self.put(self.pick([",", " ,", "\n,"]))
            self.put(self.pick(["]", "\n]", " # ]\n ]"]))
        else:
            self.put("{")
            for item in range(self.data.draw(st.integers(0, 3))):
                self.put(", " if item else " ")
                self.pair(path, depth - 1)
            self.put(" }")

    def pair(self, table: tuple[str | int, ...], depth: int = 2) -> None:
        path = self.key(table, self.pick([1, 1, 2]))
        self.put(self.pick(["=", " = ", "\t=  "]))
        self.value(path, depth)

    def statements(self, table: tuple[str | int, ...]) -> None:
        for _ in range(self.data.draw(st.integers(0, 3))):
            self.put(self.pick(GAPS))
            self.put(self.pick(["", "  "]))
            self.pair(table)
            self.put(self.pick(["\n", "  # [[not]] = 1\n"]))

    def document(self) -> None:
        self.statements(())
        lists: list[tuple[tuple[str | int, ...], str, int]] = []  # path, spelling, how many so far
        for _ in range(self.data.draw(st.integers(0, 5))):
            self.put(self.pick(GAPS))
            kind = self.pick(["table", "list", "again", "within"] if lists else ["table", "list"])
            if kind == "table":
                self.put("[")
                path = self.key((), self.pick([1, 2]))
                self.put("]\n")
            elif kind == "list":
                self.put("[[ ")
                start = len(self.text)
                path = self.key((), 1)
                lists = [(path, self.text[start:], 0)]
                path = (*path, 0)
                self.places.setdefault(path, self.places[path[:-1]])
                self.put("]]\n")
            elif kind == "again":
                path, spelling, count = lists[-1]
                lists[-1] = (path, spelling, count + 1)
                self.put("[[ ")
                path = (*path, count + 1)
                self.note(path)
                self.put(spelling + "]]\n")
            else:
                path, spelling, count = lists[-1]
                self.put("[" + spelling + ".")
                path = self.key((*path, count), 1)
                self.put("]\n")
            self.statements(path)


def nodes(value: Any, path: tuple[str | int, ...]) -> list[tuple[str | int, ...]]:
    """Return the paths of everything within a value."""
    items = value.items() if isinstance(value, dict) else enumerate(value) if isinstance(value, list) else ()
    return [one for key, inner in items for one in ((*path, key), *nodes(inner, (*path, key)))]


@settings(deadline=None)  # the machine may be busy
@given(st.data(), st.booleans())
def test_every_key_and_item_of_a_random_document_is_found_where_it_was_written(data: st.DataObject, crlf: bool) -> None:
    writer = Writer(data)
    writer.document()
    text = writer.text.replace("\n", "\r\n") if crlf else writer.text
    paths = nodes(tomli.loads(text), ())
    assert set(paths) <= set(writer.places)
    places = Places(text)
    assert {path: places.where(path) for path in paths} == {path: writer.places[path] for path in paths}


def test_every_key_of_a_whole_configuration_is_on_a_line_that_names_it() -> None:
    places, lines = Places(FRONT), FRONT.splitlines()
    for path in nodes(tomli.loads(FRONT), ()):
        line, column = places.where(path) or (0, 0)
        names = [part for part in path if isinstance(part, str)]
        if isinstance(path[-1], str):
            assert lines[line - 1][column - 1 :].startswith(names[-1])
        else:
            assert names[-1] in lines[line - 1]


@pytest.mark.parametrize(
    ("path", "place"),
    [
        (("a", "b"), (2, 1)),
        (("a", "missing"), (1, 2)),
        (("list", 1, "missing"), (5, 3)),
        (("list", 1, "x"), (6, 1)),
        (("list", 7), (3, 3)),
        (("nowhere", "at all"), None),
    ],
)
def test_what_is_missing_is_placed_at_its_nearest_table(path: tuple[str | int, ...], place: object) -> None:
    assert Places("[a]\nb = 1\n[[list]]\nx = 1\n[[list]]\nx = 2\n").where(path) == place


def test_a_table_opened_after_its_subtable_is_placed_at_its_own_header() -> None:
    places = Places("[a.b]\nx = 1\n[a]\ny = 2\n")
    assert places.where(("a",)) == (3, 2)
    assert places.where(("a", "b")) == (1, 4)
    assert places.where(("a", "y")) == (4, 1)


def test_a_list_within_a_list_counts_anew_in_every_item() -> None:
    places = Places("[[a]]\n[[a.b]]\nx = 1\n[[a.b]]\nx = 2\n[[a]]\n[[a.b]]\nx = 3\n")
    assert places.where(("a", 0, "b", 1, "x")) == (5, 1)
    assert places.where(("a", 1, "b", 0, "x")) == (8, 1)
