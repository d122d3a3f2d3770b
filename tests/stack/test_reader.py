"""Good stack files become the stacks they describe."""

import pickle

import numpy as np
import pytest
from numpy.testing import assert_allclose, assert_array_equal

from slabsim.errors import StackError
from slabsim.stack.reader import parse_stack, read_stack
from slabsim.stack.sample import (
    Film,
    Group,
    Layer,
    Patches,
    SeriesLoad,
    Strips,
    WireEnd,
)
from tests.stack.texts import POLYMER, SLAB, WINDOW


@pytest.fixture
def window(tmp_path):
    (tmp_path / "window.toml").write_text(WINDOW, encoding="utf-8")
    (tmp_path / "polymer.csv").write_text(POLYMER, encoding="utf-8")
    return read_stack(tmp_path / "window.toml")


def test_layers_sheets_and_groups_stand_in_the_order_of_the_file(window):
    kinds = [type(element) for element in window.elements]
    assert kinds == [Layer, Patches, Layer, Layer, Film, Group, Film]
    assert [type(element) for element in window.flatten()[5:8]] == [Layer, Layer, Strips]
    assert len(window.flatten()) == 5 + 6 * (1 + 2 * 2) + 1


def test_lengths_and_names_are_taken_over(window):
    skin, patches, slab, *_ = window.elements
    assert (skin.name, skin.thickness, skin.wires) == ("skin", 0.5e-3, ())
    assert (patches.period, patches.gap) == (2e-3, 0.2e-3)
    assert (slab.wires[0].pitch, slab.wires[0].radius, slab.wires[0].plasma) == ((2e-3, 2e-3), 50e-6, "lattice")
    assert window.elements[3].wires[0].plasma == 12.3e9
    assert window.elements[4] == Film("absorber", sheet_resistance=377.0)
    assert window.elements[6] == Film("", conductivity=5.8e7, thickness=20e-9)


def test_ends_take_the_meaning_their_faces_offer(window):
    front, back = window.elements[2].wires[0].ends
    assert (front, back) == (WireEnd("grounded"), WireEnd("joined"))
    front, back = window.elements[3].wires[0].ends
    assert front == WireEnd("joined", SeriesLoad(50.0, 1e-9, None))
    assert back == WireEnd("grounded", SeriesLoad(0.0, 0.0, 0.1e-12))


def test_materials_have_the_values_of_their_models(window):
    f = np.array([10e9])
    foam, copper = window.elements[0].material, window.elements[2].wires[0].metal
    assert_allclose(foam.permittivity(f), 1.07 * (1 + 2e-4j))
    assert_allclose(copper.permittivity(f).imag, 5.8e7 / (2 * np.pi * 10e9 * 8.8541878128e-12), rtol=1e-9)
    rings = window.elements[3].material
    assert_allclose(rings.permeability(f), 1 - 0.3 * 10e9 / 0.1e9 / 1j)
    assert window.elements[3].wires[0].metal is None
    ferrite = window.elements[5].elements[0].material
    assert_allclose((ferrite.permittivity(f)[0], ferrite.permeability(f)[0]), (12, 1.5))
    polymer = window.elements[5].elements[1].elements[0].material
    assert_allclose(polymer.permittivity(np.array([1e9, 100e9])), [2.3 + 0.001j, 2.25 + 0.002j])


def test_the_same_material_is_one_object(window):
    assert window.elements[0].material is window.elements[2].material


def test_the_sweep_is_taken_over(window):
    sweep = window.sweep
    assert_array_equal(sweep.frequencies, np.linspace(5e9, 40e9, 351))
    assert_array_equal(sweep.angles_deg, np.arange(81.0))
    assert_array_equal(sweep.azimuths_deg, [0.0, 90.0])
    assert (sweep.polarizations, sweep.model, sweep.store) == (("TM",), "local", ("amplitude",))
    assert sweep.spectral_unit == "GHz"


def test_text_and_tables_are_kept_and_rebuild_the_stack_without_the_folder(window, tmp_path):
    assert window.text == WINDOW
    assert window.file_name == "window.toml"
    assert window.tables == {"polymer.csv": POLYMER}
    again = parse_stack(window.text, tmp_path / "gone", window.file_name, window.tables)
    assert again.flatten()[0] == window.flatten()[0]
    f = np.array([20e9])
    assert again.flatten()[6].material.permittivity(f) == window.flatten()[6].material.permittivity(f)


def test_a_table_named_twice_is_read_once(tmp_path, monkeypatch):
    import slabsim.stack.reader as reader

    (tmp_path / "polymer.csv").write_text(POLYMER, encoding="utf-8")
    read = []

    def counted(path, original=reader.read_utf8):
        read.append(path.name)
        return original(path)

    monkeypatch.setattr(reader, "read_utf8", counted)
    parse_stack(SLAB + '[material.a]\ntable = "polymer.csv"\n[material.b]\ntable = "polymer.csv"\n', tmp_path)
    assert read == ["polymer.csv"]


def test_defaults_of_a_short_file():
    stack = parse_stack(SLAB)
    assert (stack.title, stack.front.name, stack.back.name) == ("", "vacuum", "vacuum")
    assert_array_equal(stack.sweep.frequencies, [10e9])
    assert_array_equal(stack.sweep.angles_deg, [30.0])
    assert_array_equal(stack.sweep.azimuths_deg, [0.0])
    assert stack.sweep.polarizations == ("TE", "TM")
    assert stack.sweep.model == "nonlocal"
    assert stack.sweep.store == ("power", "amplitude")
    assert parse_stack(SLAB.replace('ends = ["open", "open"]\n', "")).elements[0].wires[0].ends == (
        WireEnd("open"),
        WireEnd("open"),
    )


def test_a_perfect_conductor_may_back_the_stack():
    assert parse_stack('back = "perfect conductor"\n' + SLAB).back is None


def test_a_stack_survives_the_way_to_another_process():
    stack = parse_stack(SLAB)
    copy = pickle.loads(pickle.dumps(stack))
    assert copy.elements == stack.elements


def test_windows_line_ends_and_a_byte_order_mark_are_no_obstacle(tmp_path):
    path = tmp_path / "slab.toml"
    path.write_bytes(b"\xef\xbb\xbf" + SLAB.replace("\n", "\r\n").encode())
    assert read_stack(path).elements == parse_stack(SLAB).elements


@pytest.mark.parametrize(
    ("content", "message"),
    [
        (None, r"^lost.toml: there is no file .*lost.toml$"),
        (b"title = '\xff'", r"^lost.toml: .* is no UTF-8 text \(byte 9\); save it as UTF-8$"),
        (b"thickness = 2.5 mm", r"^lost.toml: not valid TOML: .*line 1, column 17.*in quotes, such as .2.5 mm"),
        (b"x = " + b"9" * 5000, r"^lost.toml: not valid TOML"),
        (b"x = " + b"[" * 50_000 + b"]" * 50_000, r"^lost.toml: .*nested too deeply"),
    ],
)
def test_what_is_no_toml_file_is_one_fault(tmp_path, content, message):
    path = tmp_path / "lost.toml"
    if content is not None:
        path.write_bytes(content)
    with pytest.raises(StackError, match=message) as caught:
        read_stack(path)
    assert len(caught.value.faults) == 1


def test_a_folder_is_no_stack_file(tmp_path):
    with pytest.raises(StackError, match="is a folder; name a file in it"):
        read_stack(tmp_path)
