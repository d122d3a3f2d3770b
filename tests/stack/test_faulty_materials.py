"""Faults of materials, each with its place and its text."""

import pytest

from tests.stack.texts import SLAB, the_fault_of


@pytest.mark.parametrize(
    ("old", "new", "fault"),
    [
        (
            "permittivity = 1.07",
            'permittivity = "1.07"',
            'line 2, material.foam: permittivity: "1.07"; it must be a plain number without quotes (remove the quotes)',
        ),
        (
            "permittivity = 1.07",
            "permittivity = { xx = 1, yy = 2 }",
            "permittivity.zz: missing; Along z, across the layer",
        ),
        ("permittivity = 1.07", "permittivity = nan", "permittivity: NaN; it must be a finite number"),
        ("permittivity = 1.07", "permittivity = inf", "permittivity: Infinity; it must be a finite number"),
        ("permittivity = 1.07", "permittivity = true", "permittivity: true; it must be a plain number"),
        (
            "permittivity = 1.07",
            "permittivity = 1.07\nloss_tangent = -2e-4",
            "line 3, material.foam: loss_tangent: -0.0002 would amplify; the loss tangent must be zero or more: "
            "with the time factor exp(-i w t) a passive medium has Im(eps) >= 0, Im(mu) >= 0 and k >= 0; data for "
            "exp(+i w t) must be conjugated",
        ),
        (
            "permittivity = 1.07",
            "permittivity = -4\nloss_tangent = 0.1",
            "line 1, material.foam: Im(eps) < 0 at 10 GHz: the material would amplify; with the time factor "
            "exp(-i w t)",
        ),
        ("permittivity = 1.07", "permittivity = 0", "material.foam: eps = 0 exactly at 10 GHz; add loss or move the"),
        ("permittivity = 1.07", "", "line 1, material.foam: no permittivity; a material has exactly one of"),
        ("permittivity = 1.07", "loss_tangent = 0.1", "material.foam: loss_tangent belongs to a permittivity"),
        (
            "permittivity = 1.07",
            'permittivity = 1\ntable = "polymer.csv"',
            "material.foam: permittivity and table together; a material has exactly one of permittivity (with "
            "loss_tangent or conductivity if lossy)",
        ),
        ("permittivity = 1.07", "permitivity = 1.07", 'permitivity: unknown key; did you mean "permittivity"?'),
        (
            "permittivity = 1.07",
            "permittivity = 1\npermeability = true",
            "permeability: true; it must be a plain number",
        ),
        (
            "permittivity = 1.07",
            "permittivity = 1\npermeability = { strength = -1, damping = '1 GHz', resonance = '1 GHz' }",
            "material.foam: permeability.strength: -1 would amplify; the strength must be zero or more",
        ),
        (
            "permittivity = 1.07",
            "permittivity = 1\npermeability = { strength = 1, damping = '0 Hz', resonance = '10 GHz' }",
            "material.foam: mu is not finite at 10 GHz, a pole of its formula; add damping or move the sweep point",
        ),
        (
            '"5.8e7 S/m"',
            '"5.8e7"',
            'material.copper: conductivity: "5.8e7" has no unit; a conductivity is wanted, such as',
        ),
        (
            '"5.8e7 S/m"',
            '"-5 S/m"',
            'line 4, material.copper: conductivity: "-5 S/m" would amplify; it must be zero or more: with the '
            "time factor exp(-i w t)",
        ),
        (
            "permittivity = 1.07",
            "drude = { plasma = '1 THz', collision = '-1 GHz' }",
            'material.foam: drude.collision: "-1 GHz" would amplify; it must be zero or more: with',
        ),
        (
            "permittivity = 1.07",
            "drude = { plasma = '1 THz', collision = '1 mm' }",
            'drude.collision: "1 mm": "mm" is a unit of length; a frequency (not a wavelength) is wanted',
        ),
        (
            "permittivity = 1.07",
            "drude = { plasma = '1 THz', colision = '1 GHz' }",
            'drude.colision: unknown key; did you mean "collision"?',
        ),
        (
            "permittivity = 1.07",
            "drude = { plasma = '1 THz' }",
            "drude.collision: missing; Collision frequency g, such as",
        ),
        (
            "permittivity = 1.07",
            "lorentz = { oscillators = [] }",
            "lorentz.oscillators: 0 items; it must have at least 1",
        ),
        (
            "permittivity = 1.07",
            "lorentz = { oscillators = [{ resonance = '1 THz', strength = -1, damping = '0 Hz' }] }",
            "material.foam: lorentz.oscillators 1: strength: -1 would amplify",
        ),
        (
            "permittivity = 1.07",
            "lorentz = { oscillators = [{ resonance = '10 GHz', strength = 1, damping = '0 Hz' }] }",
            "material.foam: eps is not finite at 10 GHz, a pole of its formula",
        ),
        (
            "permittivity = 1.07",
            "debye = { static = 2, infinity = 5, relaxation = '1 ps' }",
            "debye.static: 2 below infinity = 5 would amplify: with the time factor",
        ),
        (
            "permittivity = 1.07",
            "debye = { static = 9, infinity = 5, relaxation = '1 ns/s' }",
            'debye.relaxation: "1 ns/s": unknown unit "ns/s"; a time is wanted; did you mean "ns"?',
        ),
        (
            "permittivity = 1.07",
            "sellmeier = { B = [1.0], C = ['1 um', '2 um'] }",
            "sellmeier.C: 2 values, but B has 1",
        ),
        (
            "permittivity = 1.07",
            "sellmeier = { B = [1.0], C = ['1 um'], range = ['3 um', '2 um'] }",
            "sellmeier.range: the first wavelength must be the shorter one",
        ),
        (
            "permittivity = 1.07",
            "sellmeier = { B = [1.0], C = ['.1 um'], range = ['1 um', '2 um'] }",
            'line 1, material.foam: material "foam" is not known at 29979.2 um; its data reach from 1 um to 2 um '
            "and are not extrapolated; the sweep goes from 10 GHz to 10 GHz: narrow it or extend the data",
        ),
        (
            "permittivity = 1.07",
            'table = "lost.csv"',
            'line 2, material.foam: table: the table "lost.csv" is not among those given: polymer.csv',
        ),
        ("permittivity = 1.07", "table = 3", "material.foam: table: 3; it must be text in quotes"),
        (
            "[material.copper]",
            "[material.vacuum]\npermittivity = 1\n[material.copper]",
            'line 3, material.vacuum: "vacuum" is built in and cannot be redefined; choose another name',
        ),
        (
            "[material.copper]",
            '[material."perfect conductor"]\npermittivity = 1\n[material.copper]',
            '"perfect conductor" is built in and cannot be redefined',
        ),
        ('"5.8e7 S/m"', '"5.8e7 S/m"\npermeability = 100', 'metal: "copper" is magnetic; the metal of wires must have'),
        (
            'conductivity = "5.8e7 S/m"',
            "permittivity = 1.07",
            'metal: "copper" has the permittivity of its host at 10 GHz',
        ),
        (
            "[material.foam]",
            'front = "copper"\n[material.foam]',
            'line 1, front: "copper" is lossy at 10 GHz; the front half-space must be lossless with eps > 0 and mu > 0',
        ),
        (
            "[material.foam]",
            'front = "x"\n[material.x]\npermittivity = -2\n[material.foam]',
            'front: "x" has eps <= 0 or mu <= 0 at 10 GHz; the front half-space must be lossless',
        ),
    ],
)
def test_a_material_that_cannot_be_is_told_with_place_and_cure(old, new, fault):
    assert old in SLAB
    assert fault in the_fault_of(SLAB.replace(old, new))


def test_a_sweep_point_on_a_resonance_of_the_index_is_refused():
    text = SLAB.replace("permittivity = 1.07", 'sellmeier = { B = [1.0], C = ["10 mm"] }')
    fault = the_fault_of(text.replace('"10 GHz"', '"10 mm"'))
    assert "material.foam: eps is not finite at 10 mm, a pole of its formula; add damping or move" in fault
