"""Finding the line of a key in TOML text.

``tomllib`` gives values without places. This scanner does not parse values: it follows table headers, counts the
entries of arrays of tables, and notes where each key begins, skipping strings, comments and nested brackets. Keys
of inline tables are found as well. Text that is not valid TOML is never shown to it.
"""

from __future__ import annotations

import re
from collections.abc import Iterator, Sequence

__all__ = ["dotted", "heading", "key_lines", "line_of"]

Place = tuple[str | int, ...]

_TOKEN = re.compile(
    r"""(?P<multi>\"\"\"(?:\\.|[^\\])*?\"{3,5}|'''.*?'{3,5})
      |(?P<basic>"(?:\\.|[^"\\\n])*")
      |(?P<literal>'[^'\n]*')
      |(?P<comment>\#[^\n]*)
      |(?P<newline>\n)
      |(?P<bare>[A-Za-z0-9_+:-]+)
      |(?P<mark>[\[\]{}=,.])
      |(?P<other>.)""",
    re.VERBOSE | re.DOTALL,
)


def heading(text: str, where: str, place: Place) -> str:
    """``file:line: key`` for the head of a message; no line when not even the outermost key is there."""
    line = line_of(text, place)
    file = f"{where}:{line}" if line else where
    return f"{file}: {dotted(place)}" if place else file


def dotted(place: Place) -> str:
    """``candidates[2].gas``; entries are counted from 1, as a reader of the file would."""
    text = ""
    for key in place:
        text += f"[{key + 1}]" if isinstance(key, int) else f".{key}" if text else key
    return text


def line_of(text: str, path: Sequence[str | int]) -> int | None:
    """Line, from 1, of the key at ``path``, or of the innermost enclosing key or header that stands in the text.

    Parameters
    ----------
    text : str
        Valid TOML.
    path : sequence of str and int
        Keys from the outside in; an integer picks an entry of an array, from 0: ``("candidates", 1, "gas")``.

    Returns
    -------
    int or None
        ``None`` when not even the outermost key is there.
    """
    lines = key_lines(text)
    for length in range(len(path), 0, -1):
        if tuple(path[:length]) in lines:
            return lines[tuple(path[:length])]
    return None


def key_lines(text: str) -> dict[Place, int]:
    """The line, from 1, on which each table header and key of valid TOML text stands first."""
    return _Scanner(text).lines


class _Scanner:
    """One pass over the tokens; ``lines`` holds the result."""

    def __init__(self, text: str) -> None:
        self.lines: dict[Place, int] = {}
        self._table: Place = ()
        self._counts: dict[Place, int] = {}
        self._line = 1
        self._tokens = self._significant(text)
        self._kind, self._word = next(self._tokens)
        while self._kind != "end":
            if self._kind == "newline":
                self._advance()
            elif self._word == "[":
                self._header()
            else:
                self._pair(self._table)

    def _significant(self, text: str) -> Iterator[tuple[str, str]]:
        for match in _TOKEN.finditer(text):
            kind, word = str(match.lastgroup), match.group()
            if kind in ("comment", "other"):
                continue
            yield kind, word
            self._line += word.count("\n")
        yield "end", ""

    def _advance(self) -> None:
        self._kind, self._word = next(self._tokens)

    def _note(self, path: Place) -> None:
        self.lines.setdefault(path, self._line)

    def _keys(self) -> list[str]:
        """A dotted key, up to the sign that ends it."""
        keys: list[str] = []
        while self._kind in ("bare", "basic", "literal") or self._word == ".":
            if self._word != ".":
                keys.append(self._word if self._kind == "bare" else self._word[1:-1])
            self._advance()
        return keys

    def _header(self) -> None:
        self._advance()
        array = self._word == "["
        if array:
            self._advance()
        table: Place = ()
        keys = self._keys()
        for position, key in enumerate(keys):
            table = (*table, key)
            if array and position == len(keys) - 1:
                self._counts[table] = self._counts.get(table, -1) + 1
            self._note(table)
            if table in self._counts:
                table = (*table, self._counts[table])
                self._note(table)
        self._table = table
        for _ in range(2 if array else 1):
            self._advance()

    def _pair(self, table: Place) -> None:
        path = table
        for key in self._keys():
            path = (*path, key)
            self._note(path)
        self._advance()  # the equals sign
        self._value(path)

    def _value(self, path: Place) -> None:
        """Pass over a value; keys of inline tables and entries of arrays are noted."""
        if self._word == "[":
            self._array(path)
        elif self._word == "{":
            self._inline(path)
        else:
            # bare values such as 1.5e-3 or 2020-01-01 come as several tokens
            while self._kind not in ("newline", "end") and self._word not in (",", "]", "}"):
                self._advance()

    def _array(self, path: Place) -> None:
        self._advance()
        index = 0
        while self._word != "]":
            if self._kind == "newline" or self._word == ",":
                self._advance()
                continue
            self._note((*path, index))
            self._value((*path, index))
            index += 1
        self._advance()

    def _inline(self, path: Place) -> None:
        self._advance()
        while self._word != "}":
            if self._kind == "newline" or self._word == ",":
                self._advance()
                continue
            self._pair(path)
        self._advance()
