"""On which line of a TOML document each key stands, so that an error can name it."""

from __future__ import annotations

import re
import tomllib
from dataclasses import dataclass, field

__all__ = ["Path", "key_lines", "line_of"]

#: Where a value is: keys of tables and places in arrays.
Path = tuple[str | int, ...]

_TOKEN = re.compile(
    r"(?P<comment>\#[^\n]*)"
    r"|(?P<string>\"\"\"(?:[^\\]|\\.)*?\"{3,5}|'''.*?'{3,5}|\"(?:[^\"\\\n]|\\.)*\"|'[^'\n]*')"
    r"|(?P<mark>[\[\]{},=.\n])"
    r"|(?P<bare>[A-Za-z0-9_-]+)"
    r"|(?P<other>[^\s\[\]{},=.\#\"'A-Za-z0-9_-]+)",
    re.DOTALL,
)


def key_lines(text: str) -> dict[Path, int]:
    """Return the line, from 1, of every key and array entry of a valid TOML document (TOML 1.0)."""
    return _Scan(_tokens(text)).document()


def line_of(lines: dict[Path, int], path: Path) -> int:
    """Return the line of a value, or of the nearest table around it that stands on one; 1 at the least."""
    while path and path not in lines:
        path = path[:-1]
    return lines.get(path, 1)


def _tokens(text: str) -> list[tuple[str, str, int]]:
    """Return kind, text and line of every token; comments are left out."""
    found, line, done = [], 1, 0
    for match in _TOKEN.finditer(text):
        line += text.count("\n", done, match.start())
        done = match.start()
        if match.lastgroup != "comment":
            found.append((str(match.lastgroup), match[0], line))
    return found


@dataclass
class _Scan:
    """A walk over the tokens of a document that `tomllib` has found valid."""

    tokens: list[tuple[str, str, int]]
    at: int = 0
    lines: dict[Path, int] = field(default_factory=dict)
    counts: dict[Path, int] = field(default_factory=dict)

    def document(self) -> dict[Path, int]:
        prefix: Path = ()
        while self.at < len(self.tokens):
            if self._skip("\n"):
                continue
            if self._skip("["):
                array = self._skip("[")
                line = self.tokens[self.at][2]
                prefix = self._header(self._keys(), array)
                self.lines.setdefault(prefix, line)
                self._skip("]")
                self._skip("]")
            else:
                self._pair(prefix)
        return self.lines

    def _skip(self, mark: str) -> bool:
        found = self.at < len(self.tokens) and self.tokens[self.at][:2] == ("mark", mark)
        self.at += found
        return found

    def _keys(self) -> list[str]:
        """Read a key with its dots."""
        keys = []
        while self.at < len(self.tokens):
            kind, text, _ = self.tokens[self.at]
            self.at += 1
            keys.append(tomllib.loads(f"k = {text}")["k"] if kind == "string" else text)
            if not self._skip("."):
                break
        return keys

    def _header(self, keys: list[str], array: bool) -> Path:
        path: Path = ()
        for k, key in enumerate(keys):
            path += (key,)
            self.lines.setdefault(path, self.tokens[self.at - 1][2])
            if array and k == len(keys) - 1:
                self.counts[path] = self.counts.get(path, 0) + 1
            if path in self.counts:
                path += (self.counts[path] - 1,)
        return path

    def _pair(self, prefix: Path) -> None:
        line, path = self.tokens[self.at][2], prefix
        for key in self._keys():
            path += (key,)
            self.lines.setdefault(path, line)
        self._skip("=")
        self._value(path)

    def _value(self, path: Path) -> None:
        if self._skip("["):
            index = 0
            while self.at < len(self.tokens) and not self._skip("]"):
                if self._skip("\n") or self._skip(","):
                    continue
                self.lines[(*path, index)] = self.tokens[self.at][2]
                self._value((*path, index))
                index += 1
        elif self._skip("{"):
            while self.at < len(self.tokens) and not self._skip("}"):
                if not (self._skip("\n") or self._skip(",")):
                    self._pair(path)
        else:
            while self.at < len(self.tokens) and self.tokens[self.at][:2] not in _ENDS:
                self.at += 1


_ENDS = [("mark", mark) for mark in "\n,]}"]
