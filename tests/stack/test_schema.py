"""The JSON schema agrees with the reader."""

import tomllib

import pytest

from slabsim.stack.reader import parse_stack
from slabsim.stack.schema import stack_schema
from tests.stack.texts import GEOMETRIES, POLYMER, SLAB, WINDOW, faults_of

jsonschema = pytest.importorskip("jsonschema")


@pytest.fixture(scope="module")
def validator():
    schema = stack_schema()
    jsonschema.Draft202012Validator.check_schema(schema)
    return jsonschema.Draft202012Validator(schema)


@pytest.mark.parametrize("text", [WINDOW, SLAB, GEOMETRIES])
def test_good_files_pass(validator, text):
    assert [error.message for error in validator.iter_errors(tomllib.loads(text))] == []


@pytest.mark.parametrize(
    ("old", "new"),
    [
        ('"10 mm"', '"10 GHz"'),
        ('"10 mm"', "10"),
        ('"10 mm"', '"-10 mm"'),
        ("thickness", "thicknes"),
        ("permittivity = 1.07", 'permittivity = "1.07"'),
        ('"30 deg"', '"30 mm"'),
        ('"5.8e7 S/m"', '"5.8e7"'),
        ('["open", "open"]', '["open"]'),
        ('["open", "open"]', '["open", "shut"]'),
        ('name = "slab"', 'film = { sheet_resistance = "9 ohm" }'),
        ("[sweep]", "[seep]"),
    ],
)
def test_what_one_value_can_tell_is_refused_by_the_schema_too(validator, old, new):
    assert old in SLAB
    assert not validator.is_valid(tomllib.loads(SLAB.replace(old, new)))


@pytest.mark.parametrize(
    ("old", "new"),
    [
        ('tilt = "20 deg"', 'tilt = "20 mm"'),
        ('tilt = "20 deg", azimuth', "azimuth"),
        ('axis = "y"', 'axis = "w"'),
        ('inductance = "host"', 'inductance = "air"'),
        ('rotation = "-30 deg"', "rotation = -30"),
        ("yy = 3.0, ", ""),
        ("zz = 1.5", 'zz = "1.5"'),
        ("stiffness = 2.1", "stiffness = 0"),
        ("stiffness = 2.1", 'axis = "z"'),
        ('axis = "x", ', ""),
        ('axis = "x"', 'axis = "z"'),
        ('{ azimuth = "30 deg" }', '{ tilt = "30 deg" }'),
        ('normal = "y"', 'normal = "z"'),
        ('spacing = "4 mm"', 'spacing = "4 GHz"'),
        ('thickness = "6 mm"\n', ""),
    ],
)
def test_geometries_that_one_value_rules_out_are_refused_by_both(validator, old, new):
    assert GEOMETRIES.count(old) == 1
    text = GEOMETRIES.replace(old, new)
    assert not validator.is_valid(tomllib.loads(text))
    faults_of(text)


def nodes(schema, path=""):
    """Every key the schema describes, with its own schema."""
    for name, definition in {"": schema, **schema["$defs"]}.items():
        for key, value in definition.get("properties", {}).items():
            yield f"{name}.{key}", value


def test_every_key_is_described_and_none_takes_null():
    for place, node in nodes(stack_schema()):
        assert node.get("description"), place
        assert '"null"' not in str(node).replace("'", '"'), place


def examples(node):
    """Example texts anywhere below a node."""
    if isinstance(node, dict):
        yield from node.get("examples", [])
        for value in node.values():
            yield from examples(value)
    elif isinstance(node, list):
        for value in node:
            yield from examples(value)


@pytest.mark.parametrize(
    ("table", "key", "old"),
    [
        ("LayerTable", "thickness", '"10 mm"'),
        ("MaterialTable", "conductivity", '"5.8e7 S/m"'),
        ("SweepTable", "spectrum", '"10 GHz"'),
        ("SweepTable", "angle", '"30 deg"'),
        ("SpectrumRange", "from", '"10 GHz"'),
    ],
)
def test_the_examples_that_an_editor_offers_are_good(validator, table, key, old):
    found = [one for one in examples(stack_schema()["$defs"][table]["properties"][key]) if isinstance(one, str)]
    assert found
    for example in found:
        text = SLAB.replace(old, f'"{example}"')
        assert validator.is_valid(tomllib.loads(text))
        parse_stack(text, tables={"polymer.csv": POLYMER})
