"""Faults of the sweep, each with its place and its text."""

import pytest

from tests.stack.texts import SLAB, the_fault_of


@pytest.mark.parametrize(
    ("old", "new", "fault"),
    [
        (
            '"30 deg"',
            '"90 deg"',
            'line 16, sweep: angle: "90 deg"; an angle of incidence must satisfy 0 deg <= angle < 90',
        ),
        ('"30 deg"', '"-1 deg"', 'sweep: angle: "-1 deg"; an angle of incidence'),
        (
            '"30 deg"',
            '{ from = "0 deg", to = "1.6 rad", points = 3 }',
            'sweep: angle.to: "1.6 rad"; an angle of incidence',
        ),
        ('"30 deg"', "30", 'sweep: angle: 30 has no unit; an angle is written as text with its unit, such as "30 deg"'),
        ('"30 deg"', '"30 mm"', 'sweep: angle: "30 mm": "mm" is a unit of length; an angle is wanted'),
        ('"30 deg"', '{ values = ["1 deg", "95 deg"] }', 'sweep: angle.values 2: "95 deg"; an angle of incidence'),
        ('"30 deg"', "{ values = [] }", "sweep: angle.values: 0 items; it must have at least 1"),
        (
            '"30 deg"',
            '{ values = ["1 deg", "2 deg", "1.0 deg"] }',
            'angle.values: "1 deg" and "1 deg" are the same point twice',
        ),
        (
            '"30 deg"',
            '{ from = "0 deg", to = "9 deg", points = 3, spacing = "log" }',
            'sweep: angle: spacing = "log" needs both',
        ),
        (
            '"30 deg"',
            '"30 deg"\nazimuth = "400 deg"',
            'sweep: azimuth: "400 deg"; an azimuth must lie between -360 deg',
        ),
        ('"10 GHz"', '"0 GHz"', 'line 15, sweep: spectrum: "0 GHz"; it must be greater than zero'),
        (
            '"10 GHz"',
            '{ from = "0 GHz", to = "1 GHz", points = 3 }',
            'spectrum.from: "0 GHz"; it must be greater than zero',
        ),
        (
            '"10 GHz"',
            '{ from = "1 GHz", to = "1 um", points = 3 }',
            "sweep: spectrum: from is a frequency and to a wavelength; both must be of the same kind",
        ),
        (
            '"10 GHz"',
            '{ from = "1 GHz", to = "2 GHz", points = 0 }',
            "sweep: spectrum.points: 0; it must be at least 1",
        ),
        (
            '"10 GHz"',
            '{ from = "1 GHz", to = "2 GHz", points = 1e9 }',
            "points: 1000000000.0; it must be a whole number",
        ),
        (
            '"10 GHz"',
            '{ from = "1 GHz", to = "2 GHz", points = 10000001 }',
            "points: 10000001; it must be at most 10000000",
        ),
        (
            '"10 GHz"',
            '{ from = "1 GHz", to = "2 GHz", points = 1 }',
            "sweep: spectrum: points = 1, but from and to differ",
        ),
        ('"10 GHz"', '{ from = "1 GHz", to = "1 GHz", points = 2 }', "sweep: spectrum: from equals to, but points = 2"),
        ('"10 GHz"', '{ from = "1 GHz", to = "2 GHz" }', "sweep: spectrum.points: missing; How many points"),
        (
            '"10 GHz"',
            '{ from = "1 GHz", to = "2 GHz", points = 3, spacing = "lin" }',
            'spacing: "lin"; allowed are "linear", "log"',
        ),
        (
            '"10 GHz"',
            '{ values = ["300 um", "1 THz", "300.0 µm"] }',
            'values: "300 um" and "300 um" are the same point twice',
        ),
        (
            '"10 GHz"',
            '"10 GHz"\npolarization = "te"',
            'sweep: polarization: "te"; allowed are "TE", "TM"; did you mean "TE"?',
        ),
        (
            '"10 GHz"',
            '"10 GHz"\npolarization = ["TE", "TE"]',
            "sweep: polarization: the same word twice; name each once",
        ),
        ('"10 GHz"', '"10 GHz"\npolarization = []', "sweep: polarization: 0 items; it must have at least 1"),
        ('"10 GHz"', '"10 GHz"\nmodel = "corrected"', 'sweep: model: "corrected"; allowed are "nonlocal", "local"'),
        (
            '"10 GHz"',
            '"10 GHz"\nstore = ["powr"]',
            'store 1: "powr"; allowed are "power", "amplitude"; did you mean "power"?',
        ),
        ('"10 GHz"', '"10 GHz"\nstore = "power"', 'sweep: store: "power"; it must be a list in brackets'),
    ],
)
def test_a_sweep_that_cannot_be_is_told_with_place_and_cure(old, new, fault):
    assert old in SLAB
    assert fault in the_fault_of(SLAB.replace(old, new))
