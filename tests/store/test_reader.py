"""Reading maps, whole and broken."""

import h5py
import numpy as np
import pytest

from slabsim.errors import InputError, MapError
from slabsim.store import layout
from slabsim.store.reader import open_map
from slabsim.store.writer import MapWriter
from tests.store.demo import TABLE, demo_plan, demo_stack, expected, write_blocks, write_map


@pytest.fixture
def path(tmp_path):
    return tmp_path / "map.h5"


def test_axes_and_texts_come_back(path):
    stack = demo_stack(n_azimuths=3, text='title = "µ"\r\n[sweep]\r\n', model="local")
    write_map(path, stack)
    with open_map(path) as found:
        np.testing.assert_array_equal(found.frequencies, stack.sweep.frequencies)
        np.testing.assert_array_equal(found.angles_deg, stack.sweep.angles_deg)
        np.testing.assert_array_equal(found.azimuths_deg, stack.sweep.azimuths_deg)
        assert found.polarizations == ("TE", "TM")
        assert (found.title, found.file_name, found.model) == ("demo", "demo.toml", "local")
        assert found.stack_text == stack.text
        assert found.tables == {"polymer.csv": TABLE}
        assert found.is_complete
        assert found.state == "complete"
        assert found.block_shape == (5, 3)
        assert found.block_states == {"pending": 0, "done": 18, "failed": 0}
        assert found.models["wire_medium"] == "local"
        assert "numpy" in found.environment


def test_quantities_are_read_by_name_and_slice(path):
    stack = demo_stack(n_azimuths=2)
    write_map(path, stack)
    with open_map(path) as found:
        assert found.quantities == tuple(quantity.name for quantity in layout.QUANTITIES)
        for name in found.quantities:
            for azimuth in (0, 1):
                for row, polarization in enumerate(("TE", "TM")):
                    values = expected(stack, name)[azimuth, row]
                    np.testing.assert_array_equal(found.read(name, polarization, azimuth), values)
                    part = found.read(name, polarization, azimuth, slice(2, 9), slice(1, 2))
                    np.testing.assert_array_equal(part, values[2:9, 1:2])


def test_amplitudes_are_read_as_complex_numbers(path):
    stack = demo_stack()
    write_map(path, stack)
    with open_map(path) as found:
        r = found.read_amplitude("r", "TM", 0, slice(3, 6))
        values = expected(stack, "r_real")[0, 1] + 1j * expected(stack, "r_imag")[0, 1]
        np.testing.assert_array_equal(r, values[3:6])


def test_unknown_names_get_the_list_of_known_ones(path):
    write_map(path, demo_stack(store=("power",), polarizations=("TM",)))
    with open_map(path) as found:
        with pytest.raises(InputError, match=r"quantity 't_real': .* has transmittance, reflectance, absorptance"):
            found.read_amplitude("t", "TM")
        with pytest.raises(InputError, match=r"polarization 'TE': .* has TM"):
            found.read("transmittance", "TE")
        with pytest.raises(InputError, match=r"azimuth = 1; .* has the indices 0 to 0"):
            found.read("transmittance", "TM", 1)


def test_a_missing_file_is_named(tmp_path):
    with pytest.raises(MapError, match=r"nothing\.h5: there is no such file or folder; check the spelling"):
        open_map(tmp_path / "nothing.h5")


def test_a_folder_is_no_map(tmp_path):
    with pytest.raises(MapError, match="this is a folder; a map is a file"):
        open_map(tmp_path)


def test_a_text_file_is_no_map(path):
    path.write_text("title = 1")
    with pytest.raises(MapError, match="this is no HDF5 file, so no slabsim map"):
        open_map(path)


def test_an_empty_file_is_no_map(path):
    path.write_bytes(b"")
    with pytest.raises(MapError, match="this is no HDF5 file, so no slabsim map"):
        open_map(path)


def test_another_hdf5_file_is_no_map(path):
    with h5py.File(path, "w") as file:
        file["x"] = 1
    with pytest.raises(MapError, match="this HDF5 file is no slabsim map"):
        open_map(path)


def test_another_format_is_refused_with_the_version_that_wrote_it(path):
    write_map(path, demo_stack())
    with h5py.File(path, "r+") as file:
        file.attrs["slabsim_format"] = "2.0"
        file.attrs["creator_version"] = "7.1"
    with pytest.raises(
        MapError, match=r"format 2\.0, this program reads format 1\.0; .*slabsim that wrote it \(7\.1\)"
    ):
        open_map(path)
    stack = demo_stack()
    with pytest.raises(MapError, match=r"format 2\.0"):
        MapWriter.resume(path, stack, demo_plan(stack))


@pytest.mark.parametrize("fraction", [0.02, 0.3, 0.9, 0.999])
def test_a_map_cut_short_is_refused(path, fraction):
    write_map(path, demo_stack())
    whole = path.read_bytes()
    path.write_bytes(whole[: int(len(whole) * fraction)])
    with pytest.raises(MapError, match=r"the file is cut short, .*copy it again"):
        open_map(path)


def test_a_map_without_its_parts_is_called_damaged(path):
    write_map(path, demo_stack())
    with h5py.File(path, "r+") as file:
        del file[layout.PROGRESS]
    with pytest.raises(MapError, match=r"it cannot be read .*damaged or no slabsim map"):
        open_map(path)


def spoil(path, name, coordinates):
    """Change one byte of a chunk."""
    with h5py.File(path) as file:
        start = file[name].id.get_chunk_info_by_coord(coordinates).byte_offset
    with path.open("r+b") as raw:
        raw.seek(start + 11)
        byte = raw.read(1)
        raw.seek(start + 11)
        raw.write(bytes([byte[0] ^ 1]))


def test_a_damaged_block_is_named_and_the_others_are_read(path):
    stack = demo_stack()
    write_map(path, stack)
    spoil(path, f"{layout.DATA}/reflectance", (0, 1, 5, 0))
    with open_map(path) as found:
        with pytest.raises(
            MapError, match=r"reflectance is damaged between 2\.09091e\+10 and 3\.36364e\+10 Hz.*--repl"
        ):
            found.read("reflectance", "TM")
        np.testing.assert_array_equal(found.read("reflectance", "TE"), expected(stack, "reflectance")[0, 0])
        part = found.read("reflectance", "TM", 0, slice(0, 5))
        np.testing.assert_array_equal(part, expected(stack, "reflectance")[0, 1, :5])


def test_a_damaged_block_of_an_unfinished_map_is_cured_by_resuming(path):
    stack = demo_stack()
    write_blocks(path, stack, demo_plan(stack), [0, 1, 2])
    spoil(path, f"{layout.DATA}/reflectance", (0, 1, 5, 0))
    with open_map(path) as found, pytest.raises(MapError, match=r"damaged.*--resume"):
        found.read("reflectance", "TM")


def test_a_hole_in_the_layout_never_raises_anything_but_a_map_error(path):
    write_map(path, demo_stack())
    whole = path.read_bytes()
    with h5py.File(path) as file:
        end = file[layout.DATA]["transmittance"].id.get_chunk_info_by_coord((0, 0, 0, 0)).byte_offset
    messages = []
    for start in range(48, end, 250):
        if b"GCOL" in whole[max(start - 4096, 0) : start + 250]:
            continue  # HDF5 2.0 never returns from a heap of strings that is all zero
        path.write_bytes(whole[:start] + bytes(250) + whole[start + 250 :])
        try:
            with open_map(path) as found:
                found.read("reflectance", "TM")
        except MapError as error:
            messages.append(str(error))
    assert all(str(path) in message for message in messages)
    assert len(messages) > 5


def test_a_map_open_twice_in_one_program_is_explained(path):
    stack = demo_stack()
    write_blocks(path, stack, demo_plan(stack), [0])
    with open_map(path), pytest.raises(MapError, match="this program has the map open in another way; close that"):
        MapWriter.resume(path, stack, demo_plan(stack))
    with MapWriter.resume(path, stack, demo_plan(stack)), pytest.raises(MapError, match="close that first"):
        open_map(path)
