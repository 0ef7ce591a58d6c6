"""Where in a TOML text each key stands: tomllib reads the values but forgets the lines."""

from __future__ import annotations

import re
from collections.abc import Iterator

Path = tuple[str | int, ...]

_token = re.compile(
    r'''(?P<text>"""(?:\\.|(?!""").)*"{3,5}|\'\'\'.*?\'{3,5}|"(?:\\.|[^"\\\n])*"|'[^'\n]*')'''
    r"|(?P<comment>\#[^\n]*)|(?P<end>\n)|(?P<mark>[\[\]{}=,.])|(?P<space>[ \t\r]+)"
    r"|(?P<bare>[^\s\[\]{}=,.\#]+)",
    re.DOTALL,
)


def line_of_keys(text: str) -> dict[Path, int]:
    """The line, from 1, of every key and table of a sound TOML text, by its path.

    A path holds the keys from the top and, for the entries of an array, their numbers from 0:
    ("body", 1, "draught"). Tables and arrays made by dotted keys count too.
    """
    return _Scanner(text).scan()


def nearest_line(lines: dict[Path, int], path: Path) -> int | None:
    """The line of a key, or of the innermost table round it that the text has."""
    for length in range(len(path), 0, -1):
        if path[:length] in lines:
            return lines[path[:length]]
    return None


class _Scanner:
    """Walks the tokens of a text that tomllib has found sound, so nothing is checked again."""

    def __init__(self, text: str) -> None:
        self.tokens = list(_tokens(text))
        self.at = 0
        self.lines: dict[Path, int] = {}
        self.counts: dict[Path, int] = {}  # tables so far under each [[header]]

    def scan(self) -> dict[Path, int]:
        table: Path = ()
        while self.at < len(self.tokens):
            if self._peek() == "\n":
                self.at += 1
            elif self._peek() == "[":
                table = self._header()
            else:
                self._key_and_value(table)
        return self.lines

    def _peek(self) -> str:
        return self.tokens[self.at][0] if self.at < len(self.tokens) else "\n"

    def _take(self) -> tuple[str, int]:
        self.at += 1
        return self.tokens[self.at - 1]

    def _header(self) -> Path:
        line = self._take()[1]
        repeated = self._peek() == "["
        self.at += repeated
        keys = self._keys()
        self.at += 1 + repeated  # the closing brackets
        path: Path = ()
        for key in keys[:-1]:
            path = self._last_entry((*path, key))
        path = (*path, keys[-1])
        self.lines.setdefault(path, line)
        if repeated:
            self.counts[path] = self.counts.get(path, -1) + 1
            path = self._last_entry(path)
            self.lines[path] = line
        return path

    def _last_entry(self, path: Path) -> Path:
        return (*path, self.counts[path]) if path in self.counts else path

    def _keys(self) -> list[str]:
        keys = [self._key()]
        while self._peek() == ".":
            self.at += 1
            keys.append(self._key())
        return keys

    def _key(self) -> str:
        text = self._take()[0]
        return text[1:-1] if text[0] in "\"'" else text

    def _key_and_value(self, table: Path) -> None:
        line = self.tokens[self.at][1]
        path = table
        for key in self._keys():
            path = (*path, key)
            self.lines.setdefault(path, line)
        self.at += 1  # the equals sign
        self._value(path)

    def _value(self, path: Path) -> None:
        if self._peek() == "[":
            self._list(path)
        elif self._peek() == "{":
            self._inline_table(path)
        else:
            while self._peek() not in ("\n", ",", "]", "}"):
                self.at += 1

    def _list(self, path: Path) -> None:
        self.at += 1
        number = 0
        while self._peek() != "]":
            if self._peek() in ("\n", ","):
                self.at += 1
                continue
            self.lines[(*path, number)] = self.tokens[self.at][1]
            self._value((*path, number))
            number += 1
        self.at += 1

    def _inline_table(self, path: Path) -> None:
        self.at += 1
        while self._peek() != "}":
            if self._peek() in ("\n", ","):
                self.at += 1
            else:
                self._key_and_value(path)
        self.at += 1


def _tokens(text: str) -> Iterator[tuple[str, int]]:
    line = 1
    for match in _token.finditer(text):
        if match.lastgroup not in ("space", "comment"):
            yield match.group(), line
        line += match.group().count("\n")
