"""On which line of a TOML text each key stands.

The standard TOML reader gives values without places. This walk over the same text, which that reader
has accepted before, needs no error handling: it follows headers, dotted keys, inline tables, arrays
and the four kinds of strings, and skips everything else.
"""

import re
import tomllib

Path = tuple[str | int, ...]
_STRINGS = re.compile(r'"""(?:\\.|[^\\])*?"{3,5}|\'\'\'.*?\'{3,5}|"(?:\\.|[^"\\\n])*"|\'[^\'\n]*\'', re.DOTALL)
_SKIPPED = re.compile(r"(?:[ \t\r\n]|#[^\n]*)*")
_BARE = re.compile(r"[A-Za-z0-9_-]+")
_SCALAR = re.compile(r"[^,\]\}\n#]*")


def key_lines(text: str) -> dict[Path, int]:
    """Line number, from 1, of every key path of a valid TOML `text`; list items count from 0."""
    return _Walk(text).document()


class _Walk:
    def __init__(self, text: str) -> None:
        self.text = text
        self.place = 0
        self.lines: dict[Path, int] = {}
        self.lengths: dict[Path, int] = {}
        self._counted = (0, 1)

    def document(self) -> dict[Path, int]:
        table: Path = ()
        while self._skip():
            if self.text.startswith("[[", self.place):
                table = self._header(2)
                index = self.lengths.get(table, 0)
                self.lengths[table] = index + 1
                table = (*table, index)
                self.lines.setdefault(table, self._line())
            elif self.text[self.place] == "[":
                table = self._header(1)
            else:
                self._pair(table)
        return self.lines

    def _header(self, brackets: int) -> Path:
        self.place += brackets
        keys = self._keys()
        self.place += brackets
        # a header goes on from the last item of every array of tables before it
        path: Path = ()
        for depth, key in enumerate(keys, 1):
            path = (*path, key)
            self.lines.setdefault(path, self._line())
            if depth < len(keys) and path in self.lengths:
                path = (*path, self.lengths[path] - 1)
        return path

    def _pair(self, table: Path) -> None:
        line = self._line()
        path = table
        for key in self._keys():
            path = (*path, key)
            self.lines.setdefault(path, line)
        self.place += 1  # =
        self._value(path)

    def _keys(self) -> list[str]:
        keys: list[str] = []
        while True:
            self._skip()
            string = _STRINGS.match(self.text, self.place)
            bare = string or _BARE.match(self.text, self.place)
            if bare is None:
                return keys
            self.place = bare.end()
            keys.append(_unquote(bare.group()) if string else bare.group())
            self._skip()
            if not self.text.startswith(".", self.place):
                return keys
            self.place += 1

    def _value(self, path: Path) -> None:
        self._skip()
        opening = self.text[self.place]
        if opening in "[{":
            self.place += 1
            index = 0
            while self._skip() and self.text[self.place] not in "]}":
                if opening == "{":
                    self._pair(path)
                else:
                    self.lines[(*path, index)] = self._line()
                    self._value((*path, index))
                    index += 1
                self._skip()
                self.place += self.text.startswith(",", self.place)
            self.place += 1
        else:
            pattern = _STRINGS if opening in "\"'" else _SCALAR
            match = pattern.match(self.text, self.place)
            self.place = match.end() if match else len(self.text)

    def _skip(self) -> bool:
        match = _SKIPPED.match(self.text, self.place)
        self.place = match.end() if match else self.place
        return self.place < len(self.text)

    def _line(self) -> int:
        place, line = self._counted
        line += self.text.count("\n", place, self.place)
        self._counted = (self.place, line)
        return line


def _unquote(string: str) -> str:
    return next(iter(tomllib.loads(f"{string} = 0")))
