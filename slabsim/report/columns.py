"""Tables of text that break between columns where the terminal is narrow: no number is ever cut."""

from __future__ import annotations

from collections.abc import Iterator, Sequence

from rich.box import SIMPLE_HEAD
from rich.cells import cell_len
from rich.console import Console, ConsoleOptions, Group, RenderableType, RenderResult
from rich.table import Table
from rich.text import Text

_PADDING = 3  # blank on either side of a cell, and one between columns
_FRAME = 1  # what the outer border adds to that


class ColumnTable:
    """A table that is printed in several parts, one below the other, where it does not fit in one.

    Parameters
    ----------
    columns : sequence of (str, str)
        Heading and "left" or "right" of each column.
    n_keys : int
        Leading columns that every part repeats.
    """

    def __init__(self, columns: Sequence[tuple[str, str]], n_keys: int) -> None:
        self._columns = list(columns)
        self._n_keys = n_keys
        self._rows: list[tuple[str, ...]] = []
        self._section_ends: set[int] = set()

    def add_row(self, *cells: str) -> None:
        """Add one cell per column."""
        self._rows.append(cells)

    def add_section(self) -> None:
        """Leave a gap below the last row."""
        self._section_ends.add(len(self._rows) - 1)

    def __rich_console__(self, console: Console, options: ConsoleOptions) -> RenderResult:
        for part in self._parts(options.max_width):
            yield self._table(part)

    def _parts(self, width: int) -> Iterator[list[int]]:
        """Columns of each part, as many as fit into `width`, at least one beside the keys."""
        widths = [
            _PADDING + max(cell_len(text) for text in (name, *(row[i] for row in self._rows)))
            for i, (name, _) in enumerate(self._columns)
        ]
        keys = list(range(self._n_keys))
        part = [*keys]
        for column in range(self._n_keys, len(self._columns)):
            if len(part) > len(keys) and sum(widths[i] for i in [*part, column]) + _FRAME > width:
                yield part
                part = [*keys]
            part.append(column)
        yield part

    def _table(self, part: list[int]) -> Table:
        table = Table(box=SIMPLE_HEAD)
        for name, justify in (self._columns[i] for i in part):
            table.add_column(Text(name), justify=justify, no_wrap=True)  # type: ignore[arg-type]
        for number, row in enumerate(self._rows):
            table.add_row(*(Text(row[i]) for i in part), end_section=number in self._section_ends)
        return table


def fact_table(rows: Sequence[tuple[str, str]]) -> Table:
    """Pairs of a name and its value, a text that may wrap."""
    table = Table(box=SIMPLE_HEAD, show_header=False)
    table.add_column(no_wrap=True)
    table.add_column()
    for name, value in rows:
        table.add_row(Text(name), Text(value))
    return table


def titled(title: str, body: RenderableType) -> RenderableType:
    """A table below its title."""
    return Group(Text(title, style="bold"), body)
