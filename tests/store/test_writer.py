"""Starting, filling and finishing a map; what is refused leaves everything as it was."""

import errno
import shutil
import subprocess
import sys

import h5py
import numpy as np
import pytest

from slabsim.errors import InputError, MapError
from slabsim.store import layout
from slabsim.store.creation import block_size, empty_size, full_size
from slabsim.store.failures import failures_explained
from slabsim.store.reader import open_map
from slabsim.store.recovery import block_datasets
from slabsim.store.writer import MapWriter
from slabsim.sweeps.plan import SweepPlan
from tests.store.demo import answer_at, demo_plan, demo_stack, expected, write_blocks, write_map

HOLD = "import h5py, sys; f = h5py.File(sys.argv[1], 'r+'); print('held', flush=True); sys.stdin.read()"


@pytest.fixture
def path(tmp_path):
    return tmp_path / "map.h5"


@pytest.fixture
def other_writer(path):
    """Another process that has a complete map open for writing."""
    write_map(path, demo_stack())
    with subprocess.Popen(
        [sys.executable, "-c", HOLD, path], stdin=subprocess.PIPE, stdout=subprocess.PIPE, text=True
    ) as process:
        assert process.stdout.readline() == "held\n"
        yield path
        process.stdin.close()
        process.wait()


def assert_refused(path, match, call, *args, **options):
    before = {file: file.read_bytes() for file in path.parent.iterdir() if file.is_file()}
    with pytest.raises(MapError, match=match):
        call(*args, **options)
    after = {file: file.read_bytes() for file in path.parent.iterdir() if file.is_file()}
    assert after == before


def test_a_new_map_is_all_nan_and_pending(path):
    stack = demo_stack(n_azimuths=2)
    write_blocks(path, stack, demo_plan(stack), [])
    with h5py.File(path) as file:
        assert file[layout.BLOCK_DONE].shape == (2, 3, 2)
        assert not np.any(file[layout.BLOCK_DONE])
        assert file[layout.STATE].asstr()[()] == "running"
        for quantity in layout.quantities(stack):
            assert np.all(np.isnan(file[layout.DATA][quantity.name]))


def test_written_blocks_are_there_and_the_others_nan(path):
    stack = demo_stack()
    plan = demo_plan(stack)
    write_blocks(path, stack, plan, [1, 4])
    is_written = np.zeros((12, 5), dtype=bool)
    for index in (1, 4):
        is_written[plan.place(index).frequencies, plan.place(index).angles] = True
    with h5py.File(path) as file:
        assert list(file[layout.BLOCK_DONE][()].ravel()) == [0, 1, 0, 0, 1, 0]
        for quantity in layout.quantities(stack):
            values = np.where(is_written, expected(stack, quantity.name), np.nan)
            np.testing.assert_array_equal(file[layout.DATA][quantity.name], values)


def test_a_block_is_on_file_as_soon_as_it_is_written(path):
    stack = demo_stack()
    plan = demo_plan(stack)
    with MapWriter.create(path, stack, plan) as writer:
        writer.write_block(0, answer_at(stack, plan.place(0)))
        shutil.copy(path, path.with_name("copy.h5"))
    with open_map(path.with_name("copy.h5")) as seen:
        assert seen.block_states == {"pending": 5, "done": 1, "failed": 0}
        part = seen.read("reflectance", "TM", 0, slice(0, 5), slice(0, 3))
        np.testing.assert_array_equal(part, expected(stack, "reflectance")[0, 1, :5, :3])


def test_a_block_is_whole_on_file_before_its_flag_says_so(path, monkeypatch):
    stack = demo_stack()
    plan = demo_plan(stack)
    flag = MapWriter._flag
    copy = path.with_name("copy.h5")

    def copy_and_flag(writer, index, value):
        shutil.copy(path, copy)
        flag(writer, index, value)

    monkeypatch.setattr(MapWriter, "_flag", copy_and_flag)
    with MapWriter.create(path, stack, plan) as writer:
        for index in range(plan.n_blocks):
            place = plan.place(index)
            writer.write_block(index, answer_at(stack, place))
            with h5py.File(copy) as file:
                assert file[layout.BLOCK_DONE][()].ravel()[index] == layout.PENDING
                for quantity in layout.quantities(stack):
                    where = (place.azimuth, slice(None), place.frequencies, place.angles)
                    values = expected(stack, quantity.name)[where]
                    np.testing.assert_array_equal(file[layout.DATA][quantity.name][where], values)


def test_a_new_map_has_its_chunk_indexes(path):
    stack = demo_stack()
    write_blocks(path, stack, demo_plan(stack), [])
    with h5py.File(path) as file:
        datasets = block_datasets(file)
        assert len(datasets) == 7 + 2
        assert [dataset.id.get_num_chunks() for dataset in datasets] == [1] * 9


def test_an_error_in_between_keeps_the_blocks_written(path):
    stack = demo_stack()
    plan = demo_plan(stack)
    writer = MapWriter.create(path, stack, plan)
    writer.write_block(0, answer_at(stack, plan.place(0)))
    with pytest.raises(ZeroDivisionError), writer:
        raise ZeroDivisionError
    with open_map(path) as seen:
        assert seen.block_states["done"] == 1


def test_a_map_with_blocks_missing_is_not_declared_complete(path):
    stack = demo_stack()
    with MapWriter.create(path, stack, demo_plan(stack)) as writer:
        writer.mark_failed(2)
        assert list(writer.unfinished_blocks()) == [0, 1, 2, 3, 4, 5]
        with pytest.raises(MapError, match=r"6 blocks are not done yet; .*--resume"):
            writer.finish()
    with open_map(path) as seen:
        assert not seen.is_complete
        assert seen.block_states == {"pending": 5, "done": 0, "failed": 1}


def test_a_block_of_the_wrong_shape_is_refused_and_not_flagged(path):
    stack = demo_stack()
    plan = demo_plan(stack)
    with MapWriter.create(path, stack, plan) as writer:
        with pytest.raises(InputError, match=r"block 1: transmittance has shape \(2, 5, 3\); it must have \(2, 5, 2\)"):
            writer.write_block(1, answer_at(stack, plan.place(0)))
        assert not np.any(writer.flags)


def test_a_block_without_t_is_refused_unless_metal_backed(path):
    stack, metal_backed = demo_stack(), demo_stack(back=None)
    plan = demo_plan(stack)
    with MapWriter.create(path, stack, plan) as writer, pytest.raises(InputError, match="backed by a perfect cond"):
        writer.write_block(0, answer_at(metal_backed, plan.place(0)))


def test_an_existing_file_is_not_touched(path):
    write_map(path, demo_stack())
    stack = demo_stack(n_freqs=30)
    assert_refused(
        path, "there is a file already; .*--replace.*--resume", MapWriter.create, path, stack, demo_plan(stack)
    )


def test_an_existing_map_is_replaced_on_request(path):
    write_map(path, demo_stack())
    stack = demo_stack(n_freqs=30)
    write_map(path, stack, replace=True)
    with open_map(path) as seen:
        assert seen.frequencies.size == 30
    assert [file.name for file in path.parent.iterdir()] == ["map.h5"]


def test_a_file_that_is_no_map_is_never_replaced(path):
    path.write_text('title = "my stack file"\n')
    stack = demo_stack()
    assert_refused(
        path, "is no map, so it is not replaced", MapWriter.create, path, stack, demo_plan(stack), replace=True
    )


def test_a_replacement_that_fails_leaves_the_old_map(path, monkeypatch):
    write_map(path, demo_stack())

    def fail(*args, **options):
        raise OSError(errno.ENOSPC, "No space left on device")

    monkeypatch.setattr("slabsim.store.writer.build", fail)
    stack = demo_stack(n_freqs=30)
    assert_refused(path, "disk is full", MapWriter.create, path, stack, demo_plan(stack), replace=True)


def test_a_failed_start_leaves_no_file(path, monkeypatch):
    def fail(*args, **options):
        raise RuntimeError("in the middle of the layout")

    monkeypatch.setattr("slabsim.store.creation._write_progress", fail)
    stack = demo_stack()
    assert_refused(path, "in the middle of the layout", MapWriter.create, path, stack, demo_plan(stack))
    assert list(path.parent.iterdir()) == []


def test_the_remains_of_a_killed_start_are_overwritten(path):
    path.with_name(".map.h5.new").write_text("half a map")
    write_map(path, demo_stack())
    assert [file.name for file in path.parent.iterdir()] == ["map.h5"]


@pytest.mark.parametrize(
    ("place", "match"),
    [
        ("missing/map.h5", r"the folder .*missing does not exist; make it first"),
        ("file/map.h5", r"the folder .*file is a file, not a folder"),
        ("folder", r"this is a folder; give the path of a file, for example .*folder/map\.h5"),
    ],
)
def test_a_place_where_no_map_can_be_is_explained(tmp_path, place, match):
    (tmp_path / "file").write_text("")
    (tmp_path / "folder").mkdir()
    stack = demo_stack()
    assert_refused(tmp_path / "x", match, MapWriter.create, tmp_path / place, stack, demo_plan(stack))


@pytest.mark.parametrize("code", [errno.EACCES, errno.EROFS, errno.EPERM])
def test_a_folder_that_may_not_be_written_is_explained(path, monkeypatch, code):
    def refuse(*args, **options):
        raise OSError(code, "refused")

    monkeypatch.setattr("slabsim.store.writer.build", refuse)
    stack = demo_stack()
    assert_refused(
        path,
        "may not be created .*permissions or choose another folder",
        MapWriter.create,
        path,
        stack,
        demo_plan(stack),
    )


def test_too_little_room_is_found_before_anything_is_written(path, monkeypatch):
    stack = demo_stack(10_000, 1000)
    plan = SweepPlan.of(stack.sweep)
    monkeypatch.setattr("shutil.disk_usage", lambda folder: type("Usage", (), {"free": 7_000_000})())
    assert_refused(path, r"12\d\d\.\d MB are needed and 7\.0 MB are free; .*store", MapWriter.create, path, stack, plan)


def test_the_room_asked_for_is_what_a_map_takes(path):
    stack = demo_stack(400, 50)
    plan = SweepPlan.of(stack.sweep, block_shape=(100, 50))
    write_map(path, stack, plan)
    assert 0.75 < path.stat().st_size / full_size(stack, plan) <= 1.0
    assert 4 * block_size(stack, plan) < path.stat().st_size
    assert empty_size(stack, plan) < full_size(stack, plan)


def test_another_writer_is_noticed(other_writer):
    stack = demo_stack()
    plan = demo_plan(stack)
    match = "another process is writing this map"
    assert_refused(other_writer, match, MapWriter.create, other_writer, stack, plan, replace=True)
    assert_refused(other_writer, match, MapWriter, other_writer, stack, plan)
    with open_map(other_writer) as seen:  # a reader may look on
        assert seen.is_complete


@pytest.mark.parametrize(
    ("error", "match"),
    [
        (
            RuntimeError("flush (errno = 28, error message = 'No space left')"),
            "disk is full.*blocks are safe.*--resume",
        ),
        (OSError(errno.EFBIG, "File too large"), "limit on file size is reached.*blocks are safe.*--resume"),
        (BlockingIOError(errno.EAGAIN, "locked"), "another process is writing this map"),
        (OSError(errno.ENOTDIR, "Not a directory"), "part of this path is a file"),
        (OSError("inflate() failed"), "cannot be written .inflate.*damaged or no slabsim map.*--replace"),
    ],
)
def test_failures_of_the_disk_say_what_to_do(path, error, match):
    with pytest.raises(MapError, match=match), failures_explained(path, "written"):
        raise error
