"""Whatever is done to a stack file, it is read or its faults are told; nothing else is raised."""

import random

import pytest

from slabsim.errors import Fault, StackError
from slabsim.stack.reader import parse_stack
from tests.stack.texts import GEOMETRIES, POLYMER, WINDOW

VALUES = [
    "3",
    "-1.5",
    "nan",
    "true",
    '"x"',
    '"1 mm"',
    '"1 GHz"',
    '"joined"',
    "[]",
    "{}",
    "[[1]]",
    "1979-05-27",
    '""',
    "[{}]",
]


def without_a_line(lines, chance):
    at = chance.randrange(len(lines))
    return lines[:at] + lines[at + 1 :]


def with_a_line_twice(lines, chance):
    at = chance.randrange(len(lines))
    return lines[: at + 1] + [lines[at]] + lines[at + 1 :]


def with_another_value(lines, chance):
    at = chance.choice([number for number, line in enumerate(lines) if " = " in line])
    return [*lines[:at], lines[at].split(" = ")[0] + " = " + chance.choice(VALUES), *lines[at + 1 :]]


def with_a_letter_changed(lines, chance):
    at = chance.choice([number for number, line in enumerate(lines) if line])
    letter = chance.randrange(len(lines[at]))
    changed = lines[at][:letter] + chance.choice("aez=\"'[]{}.,#0- ") + lines[at][letter + 1 :]
    return [*lines[:at], changed, *lines[at + 1 :]]


def with_lines_exchanged(lines, chance):
    lines = list(lines)
    first, second = chance.randrange(len(lines)), chance.randrange(len(lines))
    lines[first], lines[second] = lines[second], lines[first]
    return lines


CHANGES = [without_a_line, with_a_line_twice, with_another_value, with_a_letter_changed, with_lines_exchanged]


@pytest.mark.parametrize("text", [WINDOW, GEOMETRIES])
@pytest.mark.parametrize("seed", range(8))
def test_a_mutilated_file_is_read_or_told(seed, text):
    chance = random.Random(seed)
    told: list[Fault] = []
    for _ in range(60):
        lines = text.splitlines()
        for _ in range(chance.choice([1, 1, 2, 5])):
            lines = chance.choice(CHANGES)(lines, chance)
        try:
            parse_stack("\n".join(lines), tables={"polymer.csv": POLYMER})
        except StackError as error:
            told.extend(error.faults)
    assert len(told) > 20
    assert all(fault.what for fault in told)
