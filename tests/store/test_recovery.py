"""Going on with a map, and the moments at which a kill leaves it half written."""

import h5py
import numpy as np
import pytest

from slabsim.errors import MapError
from slabsim.store import layout
from slabsim.store.reader import open_map
from slabsim.store.recovery import is_sound
from slabsim.store.room import allocation_end
from slabsim.store.writer import MapWriter
from slabsim.sweeps.plan import SweepPlan
from tests.store.demo import answer_at, contents, demo_plan, demo_stack, expected, write_blocks, write_map

SUPERBLOCK = 48  # bytes of superblock version 2


@pytest.fixture
def path(tmp_path):
    return tmp_path / "map.h5"


def finish(path, stack, plan):
    """Resume a map and complete it; the blocks that this took."""
    with MapWriter.resume(path, stack, plan) as writer:
        left = [int(index) for index in writer.unfinished_blocks()]
        for index in left:
            writer.write_block(index, answer_at(stack, plan.place(index)))
        writer.finish()
    return left


def kill_before_the_superblock(path, stack, plan, finished, index, **options):
    """A map killed in the flush of block `index`: its data and index are on file, the end is not.

    Puts the superblock and the flags of the moment before under the rest of the moment after.
    """
    write_blocks(path, stack, plan, finished, **options)
    before = path.read_bytes()
    writer = MapWriter.resume(path, stack, plan)
    writer.write_block(index, answer_at(stack, plan.place(index)))
    after = bytearray(path.read_bytes())
    writer.close()
    with h5py.File(path) as file:
        start, size = file[layout.BLOCK_DONE].id.get_offset(), file[layout.BLOCK_DONE].size
    for part in (slice(0, SUPERBLOCK), slice(start, start + size)):
        after[part] = before[part]
    path.write_bytes(after)


def soundness(path):
    with path.open("rb") as raw, h5py.File(path) as file:
        return is_sound(file, allocation_end(raw))


@pytest.mark.parametrize("compress", [False, True])
def test_a_resumed_map_equals_one_written_in_one_go(tmp_path, compress):
    stack = demo_stack(n_azimuths=2)
    plan = demo_plan(stack)
    write_map(tmp_path / "whole.h5", stack, plan, compress=compress)
    write_blocks(tmp_path / "parts.h5", stack, plan, [0, 7, 3], compress=compress)
    assert soundness(tmp_path / "parts.h5")
    assert finish(tmp_path / "parts.h5", stack, plan) == [1, 2, 4, 5, 6, 8, 9, 10, 11]
    assert contents(tmp_path / "parts.h5") == contents(tmp_path / "whole.h5")


def test_a_complete_map_is_not_resumed(path):
    stack = demo_stack()
    write_map(path, stack)
    with pytest.raises(MapError, match="the map is complete; nothing is left to compute"):
        MapWriter.resume(path, stack, demo_plan(stack))


def test_other_blocks_than_those_of_the_map_are_refused(path):
    stack = demo_stack()
    write_blocks(path, stack, demo_plan(stack), [0])
    with pytest.raises(MapError, match=r"blocks of \(5, 3\) frequencies and angles, the plan \(6, 5\)"):
        MapWriter.resume(path, stack, SweepPlan.of(stack.sweep, block_shape=(6, 5)))


def test_a_map_that_is_not_there_cannot_be_resumed(path):
    stack = demo_stack()
    with pytest.raises(MapError, match="there is no such file"):
        MapWriter.resume(path, stack, demo_plan(stack))


@pytest.mark.parametrize("compress", [False, True])
@pytest.mark.parametrize(("finished", "index"), [([], 0), ([0], 1), ([0, 1, 2, 3], 4), ([0, 1, 2, 3, 4], 5)])
def test_a_kill_between_index_and_superblock_costs_one_block(tmp_path, compress, finished, index):
    stack = demo_stack()
    plan = demo_plan(stack)
    path = tmp_path / "map.h5"
    write_map(tmp_path / "whole.h5", stack, plan, compress=compress)
    kill_before_the_superblock(path, stack, plan, finished, index, compress=compress)
    assert not soundness(path)
    with open_map(path) as found:
        assert found.block_states["done"] == len(finished)
        for done in finished:
            place = plan.place(done)
            where = (place.frequencies, place.angles)
            values = found.read("transmittance", "TM")[where]
            np.testing.assert_array_equal(values, expected(stack, "transmittance")[0, 1][where])
    assert finish(path, stack, plan) == [i for i in range(plan.n_blocks) if i not in finished]
    assert contents(path) == contents(tmp_path / "whole.h5")
    with h5py.File(path) as file:
        assert (file[layout.DATA]["reflectance"].compression == "gzip") == compress


def test_a_rebuilt_map_keeps_its_origin(path):
    stack = demo_stack()
    plan = demo_plan(stack)
    kill_before_the_superblock(path, stack, plan, [0], 1)
    with h5py.File(path) as file:
        started = file["entry/start_time"].asstr()[()]
        models = {name: item.asstr()[()] for name, item in file[layout.MODELS].items()}
    finish(path, stack, plan)
    with open_map(path) as found:
        assert (found.start_time, found.models) == (started, models)
    assert [file.name for file in path.parent.iterdir()] == ["map.h5"]


def test_a_finished_block_that_cannot_be_read_is_computed_again(path):
    stack = demo_stack()
    plan = demo_plan(stack)
    kill_before_the_superblock(path, stack, plan, [0, 1, 2], 3)
    with h5py.File(path) as file:
        start = file[layout.DATA]["r_real"].id.get_chunk_info_by_coord((0, 0, 0, 3)).byte_offset
    with path.open("r+b") as raw:
        raw.seek(start)
        raw.write(b"spoilt")
    assert finish(path, stack, plan) == [1, 3, 4, 5]
    with open_map(path) as found:
        np.testing.assert_array_equal(found.read("r_real", "TE"), expected(stack, "r_real")[0, 0])


def test_a_finished_block_that_is_not_there_makes_a_map_unsound(path):
    stack = demo_stack()
    write_blocks(path, stack, demo_plan(stack), [0])
    with h5py.File(path, "r+") as file:
        file[layout.BLOCK_DONE][0, 2, 1] = layout.DONE
    assert not soundness(path)
