"""Faults of a stack file: keys, places, all at once."""

import re

import pytest

from slabsim.errors import StackError
from slabsim.stack.reader import parse_stack
from tests.stack.texts import SLAB, SWEEP, WINDOW, faults_of, the_fault_of


@pytest.mark.parametrize(
    ("old", "new", "fault"),
    [
        ("thickness", "thicknes", 'line 8, layer 1 "slab": thicknes: unknown key; did you mean "thickness"?'),
        ("radius", "raduis", 'line 11, layer 1 "slab": wires 1: raduis: unknown key; did you mean "radius"?'),
        (
            "[sweep]",
            "colour = 1\n[sweep]",
            'line 14, layer 1 "slab": wires 1: colour: unknown key; allowed are axis, pitch, radius, metal, ends, '
            "plasma",
        ),
        ('material = "foam"\n', "", 'line 5, layer 1 "slab": material: missing; A defined material, or "vacuum"'),
        ('pitch = "2 mm"\n', "", 'line 9, layer 1 "slab": wires 1: pitch: missing; Distance between wires'),
        ('metal = "copper"\n', "", 'layer 1 "slab": wires 1: metal: missing; A material, or "perfect conductor"'),
        ('spectrum = "10 GHz"\n', "", "line 14, sweep: spectrum: missing; { from ="),
        ('angle = "30 deg"\n', "", "line 14, sweep: angle: missing; Polar angles"),
        (
            'thickness = "10 mm"',
            'thickness = "10 mm"\ngrids = {}',
            "grids: unknown key; allowed are name, material, thickness, wires, mesh, rotation",
        ),
        ('"10 mm"', "10", 'layer 1 "slab": thickness: 10 has no unit; a length is written as text with its unit'),
        ('"10 mm"', '"10 GHz"', 'thickness: "10 GHz": "GHz" is a unit of frequency; a length is wanted'),
        ('"10 mm"', '"-10 mm"', 'thickness: "-10 mm": a length must be greater than zero here'),
        ('"10 mm"', '"0 mm"', 'thickness: "0 mm": a length must be greater than zero here'),
        ('"10 mm"', '"10 mmm"', 'thickness: "10 mmm": unknown unit "mmm"; a length is wanted; did you mean "mm"?'),
        ('name = "slab"', "name = 3", "line 6, layer 1: name: 3; it must be text in quotes"),
        (
            'material = "foam"',
            'material = "foan"',
            'line 7, layer 1 "slab": material: material "foan" is not defined; did you mean "foam"?',
        ),
        (
            'material = "foam"',
            'material = "perfect conductor"',
            'material "perfect conductor" is not defined; defined are "vacuum", "foam", "copper"',
        ),
        (
            'metal = "copper"',
            'metal = "vacuum"',
            'wires 1: metal: material "vacuum" is not defined; defined are "perfect conductor", "foam", "copper"',
        ),
        ("[material.foam]", 'front = "fom"\n[material.foam]', 'line 1, front: material "fom" is not defined; did you'),
        (
            "[material.foam]",
            'front = "perfect conductor"\n[material.foam]',
            'front: material "perfect conductor" is not defined',
        ),
        (
            "[material.foam]",
            'back = "wall"\n[material.foam]',
            'line 1, back: material "wall" is not defined; defined are "vacuum", "perfect conductor", "foam", "copper"',
        ),
        ("[material.foam]", "title = 3\n[material.foam]", "line 1, title: 3; it must be text in quotes"),
        ("[sweep]", "[seep]", 'line 14, seep: unknown key; did you mean "sweep"?'),
    ],
)
def test_one_fault_is_told_with_place_and_cure(old, new, fault):
    assert old in SLAB
    assert fault in the_fault_of(SLAB.replace(old, new))


def test_a_file_without_a_sweep_is_shown_one():
    fault = the_fault_of(SLAB[: SLAB.index("[sweep]")])
    assert fault.startswith("sweep: missing; the file needs a table such as\n    [sweep]\n    spectrum = { from =")


def test_a_file_without_layers_is_refused():
    assert the_fault_of(SWEEP).startswith("layer: missing; Layers, sheets and groups, front to back: [[layer]]")
    assert 'layers: unknown key; did you mean "layer"?' in the_fault_of(SWEEP.replace("[sweep]", "[[layers]]\n[sweep]"))


def test_tables_in_place_of_values_and_the_reverse_are_told():
    assert "material: 3; it must be a table" in the_fault_of(
        "material = 3\n"
        + SLAB[SLAB.index("[[layer") :].replace("foam", "vacuum").replace('"copper"', '"perfect conductor"')
    )
    assert "line 1, layer: a single table; its header takes two brackets, [[layer]]" in the_fault_of(
        "[layer]\n" + SWEEP
    )
    assert "line 1, sweep: 3; it must be a table" in the_fault_of(
        "sweep = 3\n[[layer]]\nfilm = { sheet_resistance = '9 ohm' }"
    )
    assert "layer 1: an entry must be a table" in the_fault_of("layer = [3]\n" + SWEEP)


def test_all_faults_are_told_at_once_in_the_order_of_the_file():
    text = WINDOW
    for old, new in (
        ("title", "titel"),
        ('"5.8e7 S/m"\n[material.gold]', '"5.8e7 GHz"\n[material.gold]'),
        ("collision", "colision"),
        ('"polymer.csv"', '"plymer.csv"'),
        ('thickness = "0.5 mm"', 'thickness = "0.5 GHz"'),
        ('radius = "50 um"', 'radius = "1.1 mm"'),
        ("repeat = 6", "repeat = 0"),
        ("points = 351", "points = 0"),
        ('"local"', '"locl"'),
    ):
        assert old in text
        text = text.replace(old, new)
    faults = faults_of(text)
    keys = ["titel", "conductivity", "colision", "table", "thickness", "radius", "repeat", "points", "model"]
    assert len(faults) == len(keys)
    for key, fault in zip(keys, faults, strict=True):
        line = int(re.match(r"line (\d+), .*\b" + key + ": ", fault)[1])
        assert key in text.splitlines()[line - 1]


def test_checks_across_tables_run_beside_other_faults():
    text = SLAB.replace('thickness = "10 mm"', "thickness = 10").replace('["open", "open"]', '["open", "grounded"]')
    text = text.replace("permittivity = 1.07", "permittivity = -1\nloss_tangent = 1.0")
    first, second, third = faults_of(text)
    assert "material.foam: Im(eps) < 0 at 10 GHz" in first
    assert "thickness: 10 has no unit" in second
    assert 'ends 2: "grounded" needs a conductor at this face' in third


def test_the_message_names_the_file_in_every_line():
    with pytest.raises(StackError, match=r'window.toml: line 1, titel: unknown key; did you mean "title"\?') as caught:
        parse_stack('titel = "x"\n' + SLAB.replace("foam", "fom", 1), file_name="window.toml")
    message = str(caught.value).splitlines()
    assert len(message) == len(caught.value.faults) == 2
    assert all(line.startswith("window.toml: line ") for line in message)


def test_table_files_are_told_apart_from_the_stack_file(tmp_path):
    (tmp_path / "polymer.csv").write_text("wavelength (um),n,k\n1,1.5,0\n2,oops,0\n", encoding="utf-8")
    text = SLAB.replace("permittivity = 1.07", 'table = "{}"')
    with pytest.raises(StackError, match=r'line 2, material.foam: table: polymer.csv, line 3: "oops" is no number'):
        parse_stack(text.replace("{}", "polymer.csv"), tmp_path)
    with pytest.raises(StackError, match=r"line 2, material.foam: table: there is no file .*lost.csv"):
        parse_stack(text.replace("{}", "lost.csv"), tmp_path)
    with pytest.raises(StackError, match=r"line 2, material.foam: table: .* cannot be read: "):
        parse_stack(text.replace("{}", "a\\u0000b"), tmp_path)
    with pytest.raises(StackError, match=r"line 2, material.foam: table: .* is a folder"):
        parse_stack(text.replace("{}", "."), tmp_path)


def test_an_unused_material_need_not_reach_over_the_sweep():
    table = '[material.spare]\nsellmeier = { B = [1.0], C = [".1 um"], range = ["1 um", "2 um"] }\n'
    assert parse_stack(table + SLAB).elements == parse_stack(SLAB).elements


def test_a_plasma_edge_is_wanted_where_the_host_is_known():
    text = SLAB.replace("permittivity = 1.07", 'table = "polymer.csv"')
    text = text.replace("[sweep]", 'plasma = "200 GHz"\n[sweep]')
    assert 'wires 1: plasma: material "foam" is not known at 200 GHz' in the_fault_of(text)
