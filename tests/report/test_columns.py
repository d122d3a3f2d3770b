from io import StringIO

import pytest
from rich.console import Console

from slabsim.report.columns import ColumnTable, fact_table

CELLS = [["TE", "10", *(f"{1.2345678 * (i + 1):.7g}" for i in range(9))], ["TM", "20", *(["0.5"] * 9)]]


def table(rows=CELLS):
    """Two keys and nine columns of numbers."""
    found = ColumnTable([("pol", "left"), ("angle", "right"), *((f"column {i}", "right") for i in range(9))], n_keys=2)
    for row in rows:
        found.add_row(*row)
    return found


def printed(renderable, width):
    """Lines on a terminal of a width."""
    out = StringIO()
    Console(file=out, width=width, force_terminal=True, color_system=None).print(renderable)
    return out.getvalue().splitlines()


@pytest.mark.parametrize("width", [40, 60, 80, 100, 132])
def test_no_cell_is_cut_at_any_width(width):
    lines = printed(table(), width)
    assert max(len(line) for line in lines) <= width
    words = " ".join(lines).split()
    assert not any("…" in word for word in words)
    for cell in CELLS[0][2:]:
        assert words.count(cell) == 1


def test_every_part_repeats_the_keys():
    lines = printed(table(), 60)
    starts = [line.split()[:2] for line in lines if line.strip()]
    n_parts = sum(start == ["pol", "angle"] for start in starts)
    assert n_parts > 1
    assert sum(start == ["TE", "10"] for start in starts) == sum(start == ["TM", "20"] for start in starts) == n_parts


def test_what_fits_exactly_stays_in_one_part():
    width = max(len(line.rstrip()) for line in printed(table(), 500)) + 1  # border on the right
    assert sum("pol" in line for line in printed(table(), width)) == 1
    assert sum("pol" in line for line in printed(table(), width - 1)) == 2


def test_cells_are_text_and_not_markup():
    lines = printed(table([["TE", "[bold]", *["[10]"] * 9]]), 200)
    assert any("[bold]" in line and line.count("[10]") == 9 for line in lines)


def test_a_table_without_rows_shows_its_headings():
    assert any("column 8" in line for line in printed(table([]), 200))


def test_facts_wrap_between_words():
    words = [f"word{i}" for i in range(30)]
    lines = printed(fact_table([("a long name of a fact", " ".join(words))]), 80)
    assert max(len(line) for line in lines) <= 80
    assert [word for word in " ".join(lines).split() if word.startswith("word")] == words
