"""The sample's own behaviour."""

from slabsim.materials.material import VACUUM
from slabsim.stack.sample import Film, Group, Layer, Stack, Sweep


def test_groups_are_written_out_in_order_and_nested():
    air, film = Layer("air", VACUUM, 1e-3), Film("", sheet_resistance=377.0)
    inner = Group(2, (air,))
    stack = Stack("", VACUUM, None, (film, Group(2, (inner, film))), Sweep([], [], []))
    assert stack.flatten() == (film, air, air, film, air, air, film)
