"""Faults in the form of `[[layer]]` entries, each with its place and its text."""

import pytest

from tests.stack.texts import SWEEP, faults_of


@pytest.mark.parametrize(
    ("entry", "fault"),
    [
        (
            "",
            "line 1, layer 1: an empty entry; an entry is either a layer (material, thickness, and wires or mesh "
            "if any), plates (plates, thickness), a sheet (one of patches, strips, film, grid) or a group "
            "(repeat, layers)",
        ),
        ('name = "x"', 'line 1, layer 1 "x": an empty entry; an entry is either'),
        ('pacthes = { period = "2 mm" }', 'line 1, layer 1: unknown key "pacthes"; did you mean "patches"?'),
        ('antenna = { pitch = "2 mm" }', 'layer 1: unknown key "antenna"; an entry is either a layer'),
        ('material = "vacuum"\nfilm = {}', "layer 1: material and film in one entry; an entry is either a layer"),
        ('strips = {}\nthickness = "1 mm"', "layer 1: strips and thickness in one entry; an entry is"),
        ("repeat = 2\nstrips = {}", "layer 1: repeat and strips in one entry; an entry is either"),
        (
            'patches = { period = "2 mm", gap = "2 mm" }',
            'layer 1: patches.gap: "2 mm" with period "2 mm"; the gap must be less than the period',
        ),
        (
            'strips = { period = "2 mm", width = "3 mm" }',
            'strips.width: "3 mm" with period "2 mm"; the width must be less',
        ),
        ('strips = { period = "2 mm" }', "line 2, layer 1: strips.width: missing; Width of a strip"),
        (
            "film = {}",
            "layer 1: film: nothing given; a film has either sheet_resistance, or conductivity and thickness",
        ),
        ('film = { conductivity = "1 S/m" }', "layer 1: film: conductivity given; a film has either"),
        (
            'film = { sheet_resistance = "1 ohm", thickness = "1 nm" }',
            "film: sheet_resistance and thickness given; a film",
        ),
        (
            'film = { sheet_resistance = "0 ohm" }',
            'film.sheet_resistance: "0 ohm": a resistance must be greater than zero',
        ),
        ('film = { sheet_resistence = "9 ohm" }', 'sheet_resistence: unknown key; did you mean "sheet_resistance"?'),
        (
            "repeat = 0\n[[layer.layers]]\nfilm = { sheet_resistance = '9 ohm' }",
            "layer 1: repeat: 0; it must be at least 1",
        ),
        (
            "repeat = 1.5\n[[layer.layers]]\nfilm = { sheet_resistance = '9 ohm' }",
            "repeat: 1.5; it must be a whole number",
        ),
        ("repeat = 3", "layer 1: layers: missing; What is repeated, front to back"),
        ("repeat = 3\nlayers = []", "layer 1: layers: 0 items; it must have at least 1"),
        (
            'repeat = 3\n[layer.layers]\nfilm = { sheet_resistance = "9 ohm" }',
            "layers: a single table; its header takes two brackets, [[layer.layers]]",
        ),
        (
            'repeat = 3\n[[layer.layers]]\nname = "inner"\nmaterial = "vacuum"\nthickness = 3',
            'line 6, layer 1: layers 1 "inner": thickness: 3 has no unit',
        ),
        (
            'repeat = 10001\n[[layer.layers]]\nfilm = { sheet_resistance = "9 ohm" }',
            "line 1, layer: 10001 layers and sheets, groups written out; at most 10000 are allowed",
        ),
        (f'repeat = {10**30}\n[[layer.layers]]\nfilm = {{ sheet_resistance = "9 ohm" }}', "at most 10000 are allowed"),
    ],
)
def test_an_entry_without_a_clear_form_is_told_what_it_can_be(entry, fault):
    faults = faults_of(f"[[layer]]\n{entry}\n{SWEEP}")
    assert len(faults) <= 2  # an unknown key and a form that misses it may come together
    assert any(fault in one for one in faults), faults
