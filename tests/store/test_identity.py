"""Which computation a map belongs to."""

import re

import numpy as np
import pytest

from slabsim.errors import MapError
from slabsim.store.identity import digest
from slabsim.store.reader import open_map
from slabsim.store.writer import MapWriter
from tests.store.demo import TABLE, TEXT, demo_plan, demo_stack, write_blocks, write_map

CHANGES = [
    (
        {"text": TEXT.replace("50", "60")},
        r"stack text differs from line 2 on: the map has '# radius 50 .*'; now '# rad",
    ),
    ({"text": TEXT + "more"}, "stack text differs from line 5 on: the map has ''; now 'more'"),
    ({"tables": {"polymer.csv": TABLE + "1,1;1,5;0\n"}}, "table file 'polymer.csv' differs from line 3 on"),
    ({"tables": {}}, "table file 'polymer.csv' is no longer used"),
    ({"tables": {"polymer.csv": TABLE, "b.csv": ""}}, "table file 'b.csv' is new"),
    (
        {"n_freqs": 13},
        r"frequency: the map has 12 points from 5000000000 to 4e\+10; now 13 points from 5000000000 to 4e\+10",
    ),
    ({"n_angles": 6}, "angle: the map has 5 points from 0 to 80; now 6 points from 0 to 80"),
    ({"n_azimuths": 2}, "azimuth: the map has 1 point at 0; now 2 points from 0 to 90"),
    ({"polarizations": ("TM",)}, r"polarizations: the map has \('TE', 'TM'\); now \('TM',\)"),
    ({"model": "local"}, "model: the map has 'nonlocal'; now 'local'"),
    ({"store": ("power",)}, r"store: the map has \('amplitude', 'power'\); now \('power',\)"),
]


@pytest.mark.parametrize(("change", "match"), CHANGES)
def test_a_change_of_the_computation_is_named_and_refused(tmp_path, change, match):
    path = tmp_path / "map.h5"
    stack = demo_stack()
    write_blocks(path, stack, demo_plan(stack), [0])
    before = path.read_bytes()
    changed = demo_stack(**change)
    assert digest(changed) != digest(stack)
    with pytest.raises(MapError, match=f"belongs to another computation: .*{match}.*; go on with the stack file as"):
        MapWriter.resume(path, changed, demo_plan(changed))
    assert path.read_bytes() == before


def test_the_digest_is_that_of_the_map(tmp_path):
    stack = demo_stack(n_azimuths=2, store=("amplitude", "power"))
    write_map(tmp_path / "map.h5", stack)
    with open_map(tmp_path / "map.h5") as found:
        found.check_same(stack)
        assert found._identity.digest() == digest(stack)
    assert re.fullmatch("[0-9a-f]{64}", digest(stack))


def test_the_digest_does_not_depend_on_the_order_of_what_is_kept():
    assert digest(demo_stack(store=("amplitude", "power"))) == digest(demo_stack())


def test_the_last_bit_of_a_frequency_counts():
    stack, other = demo_stack(), demo_stack()
    other.sweep.frequencies[3] = np.nextafter(other.sweep.frequencies[3], 0)
    assert digest(stack) != digest(other)


def test_a_stack_without_text_cannot_be_resumed(tmp_path):
    stack = demo_stack(text="", tables={})
    write_blocks(tmp_path / "map.h5", stack, demo_plan(stack), [0])
    with pytest.raises(MapError, match="without text cannot be compared"):
        MapWriter.resume(tmp_path / "map.h5", stack, demo_plan(stack))
