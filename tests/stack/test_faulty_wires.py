"""Faults of wires, each with its place and its text."""

import pytest

from tests.stack.texts import SLAB, the_fault_of


@pytest.mark.parametrize(
    ("old", "new", "fault"),
    [
        (
            'radius = "50 um"',
            'radius = "1 mm"',
            'line 11, layer 1 "slab": wires 1: radius: "1 mm" with pitch "2 mm": neighbouring wires touch; the '
            "radius must be less than 1 mm",
        ),
        (
            'pitch = "2 mm"',
            'pitch = ["2 mm", "0.08 mm"]',
            'radius: "50 um" with pitch "80 um": neighbouring wires touch',
        ),
        ('pitch = "2 mm"', 'pitch = ["2 mm"]', "wires 1: pitch: 1 item; it must have at least 2"),
        ('pitch = "2 mm"', 'pitch = ["2 mm", "3 mm", "4 mm"]', "wires 1: pitch: 3 items; it must have at most 2"),
        ('pitch = "2 mm"', 'pitch = ["2 mm", "3 GHz"]', 'wires 1: pitch 2: "3 GHz": "GHz" is a unit of frequency'),
        (
            'pitch = "2 mm"',
            'pitch = "2 mm"\naxis = "v"',
            'wires 1: axis: "v"; allowed are "x", "y", "z", or a table { tilt, azimuth }',
        ),
        (
            'pitch = "2 mm"',
            'pitch = "2 mm"\naxis = "x"',
            "wires 1: ends of wires that are parallel to the faces: they end at no face; leave ends out",
        ),
        (
            'pitch = "2 mm"',
            'pitch = "2 mm"\naxis = { tilt = "95 deg" }',
            'wires 1: axis.tilt: "95 deg"; a tilt from z must lie between 0 deg and 90 deg',
        ),
        (
            'pitch = "2 mm"',
            'pitch = "2 mm"\naxis = { tilt = "89.95 deg" }',
            'axis.tilt: "89.95 deg": such wires hardly reach the other face; a tilt is at most 89.9 deg, or "90 deg"',
        ),
        (
            'pitch = "2 mm"',
            'pitch = "2 mm"\naxis = { azimuth = "0 deg" }',
            "axis.tilt: missing; Angle from z, 0 to 90 deg",
        ),
        (
            'pitch = "2 mm"',
            'pitch = "2 mm"\naxis = { tilt = "20 deg", azimut = "3 deg" }',
            'axis.azimut: unknown key; did you mean "azimuth"?',
        ),
        (
            'pitch = "2 mm"',
            'pitch = "2 mm"\ninductance = "hots"',
            'inductance: "hots"; allowed are "vacuum", "host"; did you',
        ),
        (
            '["open", "open"]',
            '["open", "opne"]',
            'wires 1: ends 2: "opne"; allowed are "open", "grounded", "joined"; did you mean "open"?',
        ),
        (
            '["open", "open"]',
            '["open", "cut"]',
            'ends 2: "cut"; allowed are "open", "grounded", "joined", or a table { resistance, inductance, '
            "capacitance }",
        ),
        ('["open", "open"]', '["open"]', "wires 1: ends: 1 item; it must have at least 2"),
        ('["open", "open"]', '"open"', 'wires 1: ends: "open"; it must be a list in brackets'),
        ('["open", "open"]', '["open", {}]', "wires 1: ends 2: an empty load; give resistance, inductance or"),
        (
            '["open", "open"]',
            '["open", { resistance = "-1 ohm" }]',
            'ends 2: resistance: "-1 ohm": a resistance must be zero or more here',
        ),
        ('["open", "open"]', '["open", { capacitance = "0 pF" }]', "capacitance must be greater than zero"),
        (
            '["open", "open"]',
            '["open", { resistence = "1 ohm" }]',
            'resistence: unknown key; did you mean "resistance"?',
        ),
        (
            'metal = "copper"',
            'metal = "copper"\nplasma = "latice"',
            'plasma: "latice"; allowed are "lattice", "logarithmic", "gap"; did you mean "lattice"?',
        ),
        (
            'metal = "copper"',
            'metal = "copper"\nplasma = "12 mohm"',
            'plasma: "12 mohm": "mohm" is a unit of resistance',
        ),
        ('radius = "50 um"', 'radius = "0.6 mm"', "wires 1: plasma: the lattice formula has no solution at radius"),
        ("[[layer.wires]]", "[layer.wires]", "wires: a single table; its header takes two brackets, [[layer.wires]]"),
    ],
)
def test_wires_that_cannot_be_are_told_with_place_and_cure(old, new, fault):
    assert old in SLAB
    assert fault in the_fault_of(SLAB.replace(old, new))
