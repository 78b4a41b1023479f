"""Where every key of a TOML text stands, so that a fault can name its line."""

from __future__ import annotations

from collections.abc import Iterator

KeyPath = tuple[str | int, ...]
"""Keys and list positions from the top of the file: ``("fuels", "natural_gas", "values", 0, "lower")``."""


class KeyLines:
    r"""Lines of the keys of one TOML text that the standard library has accepted.

    The text is valid TOML, so this walk only has to find keys: it skips over values without reading
    them, except arrays and inline tables, whose elements have lines of their own.

    Examples
    --------
    >>> lines = KeyLines("[site]\nname = 'Dairy'\n[[distrust]]\ntag = 'air'\n")
    >>> lines.of(("distrust", 0, "tag")), lines.of(("site", "zone"))
    (4, 1)
    """

    def __init__(self, text: str) -> None:
        self._text = text.replace("\r\n", "\n")
        self._at = 0
        self._line = 1
        self._lines: dict[KeyPath, int] = {}
        self._elements: dict[KeyPath, int] = {}
        self._walk()

    def of(self, path: KeyPath) -> int:
        """Line of a key, or of the nearest table around it that the file holds (1 for the file itself)."""
        for end in range(len(path), 0, -1):
            line = self._lines.get(path[:end])
            if line is not None:
                return line
        return 1

    def _walk(self) -> None:
        table: KeyPath = ()
        while self._blank(newlines=True):
            if self._peek("[["):
                self._skip(2)
                table = self._array_table(tuple(self._key()))
                self._blank(newlines=False)
                self._skip(2)
            elif self._peek("["):
                self._skip(1)
                table = self._table(tuple(self._key()))
                self._blank(newlines=False)
                self._skip(1)
            else:
                self._pair(table)

    def _array_table(self, key: KeyPath) -> KeyPath:
        path = self._inside(key[:-1]) + key[-1:]
        index = self._elements.get(path, -1) + 1
        self._elements[path] = index
        self._note(path)
        element = (*path, index)
        self._lines[element] = self._line
        return element

    def _table(self, key: KeyPath) -> KeyPath:
        path = self._inside(key[:-1]) + key[-1:]
        self._note(path)
        self._lines[path] = self._line
        return path

    def _inside(self, key: KeyPath) -> KeyPath:
        """Path of the tables around a header, arrays of tables by their latest element."""
        path: KeyPath = ()
        for part in key:
            path = (*path, part)
            if path in self._elements:
                path = (*path, self._elements[path])
        return path

    def _note(self, path: KeyPath) -> None:
        for end in range(1, len(path) + 1):
            self._lines.setdefault(path[:end], self._line)

    def _pair(self, table: KeyPath) -> None:
        path = table + tuple(self._key())
        self._note(path)
        self._blank(newlines=False)
        self._skip(1)  # the equals sign
        self._blank(newlines=False)
        self._value(path)

    def _key(self) -> Iterator[str]:
        while True:
            self._blank(newlines=False)
            if self._text[self._at] in "\"'":
                yield self._quoted()
            else:
                start = self._at
                while self._text[self._at] not in " \t.=]\n":
                    self._at += 1
                yield self._text[start : self._at]
            self._blank(newlines=False)
            if not self._peek("."):
                return
            self._skip(1)

    def _quoted(self) -> str:
        start = self._at
        self._string()
        quoted = self._text[start : self._at]
        if quoted[0] == "'":
            return quoted[1:-1]
        import tomllib

        return str(tomllib.loads(f"key = {quoted}")["key"])

    def _value(self, path: KeyPath) -> None:
        if self._peek("["):
            self._array(path)
        elif self._peek("{"):
            self._inline_table(path)
        elif self._text[self._at] in "\"'":
            self._string()
        else:
            while self._at < len(self._text) and self._text[self._at] not in ",]}#\n":
                self._at += 1

    def _array(self, path: KeyPath) -> None:
        self._skip(1)
        index = 0
        while self._blank(newlines=True) and not self._peek("]"):
            self._lines[(*path, index)] = self._line
            self._value((*path, index))
            index += 1
            self._blank(newlines=True)
            if self._peek(","):
                self._skip(1)
        self._skip(1)

    def _inline_table(self, path: KeyPath) -> None:
        self._skip(1)
        while self._blank(newlines=True) and not self._peek("}"):
            self._pair(path)
            self._blank(newlines=True)
            if self._peek(","):
                self._skip(1)
        self._skip(1)

    def _string(self) -> None:
        mark = self._text[self._at]
        fence = mark * 3 if self._peek(mark * 3) else mark
        self._skip(len(fence))
        while not self._peek(fence):
            self._skip(2 if mark == '"' and self._peek("\\") else 1)
        self._skip(len(fence))
        while len(fence) == 3 and self._peek(mark):  # up to two quotes may stand before the closing fence
            self._skip(1)

    def _blank(self, *, newlines: bool) -> bool:
        """Skip blanks and comments (and line ends); tell whether any text is left."""
        while self._at < len(self._text):
            character = self._text[self._at]
            if character == "#":
                while self._at < len(self._text) and self._text[self._at] != "\n":
                    self._at += 1
            elif character in " \t" or (newlines and character == "\n"):
                self._skip(1)
            else:
                return True
        return False

    def _peek(self, expected: str) -> bool:
        return self._text.startswith(expected, self._at)

    def _skip(self, count: int) -> None:
        self._line += self._text.count("\n", self._at, self._at + count)
        self._at += count
