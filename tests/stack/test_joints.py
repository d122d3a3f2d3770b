"""Which wire ends may meet at a face, and what they then mean."""

import pytest

from slabsim.stack.reader import parse_stack
from tests.stack.texts import SWEEP, faults_of, the_fault_of

LOAD = '{ resistance = "50 ohm" }'


def wires(front, back, pitch='"2 mm"', table="layer"):
    """A layer with wires; words are quoted, tables taken as they are."""
    front, back = (end if end.startswith("{") else f'"{end}"' for end in (front, back))
    return (
        f'[[{table}]]\nmaterial = "vacuum"\nthickness = "1 mm"\n[[{table}.wires]]\npitch = {pitch}\nradius = "50 um"\n'
        f'metal = "perfect conductor"\nends = [{front}, {back}]\n'
    )


PLAIN = '[[layer]]\nmaterial = "vacuum"\nthickness = "1 mm"\n'
PATCHES = '[[layer]]\npatches = { period = "2 mm", gap = "0.2 mm" }\n'
STRIPS = '[[layer]]\nstrips = { period = "2 mm", width = "0.2 mm" }\n'
FILM = '[[layer]]\nfilm = { sheet_resistance = "9 ohm" }\n'
BACKED = 'back = "perfect conductor"\n'
GROUP = "[[layer]]\nrepeat = 3\n"


def kinds(text):
    """Kinds of the ends of all layers with wires, front to back."""
    layers = parse_stack(text + SWEEP).flatten()
    return [tuple(end.kind for end in layer.wires[0].ends) for layer in layers if getattr(layer, "wires", None)]


@pytest.mark.parametrize(
    ("text", "expected"),
    [
        (wires("open", "open"), [("open", "open")]),
        (BACKED + wires("open", "grounded"), [("open", "grounded")]),
        (BACKED + wires("open", "open"), [("open", "open")]),
        (BACKED + wires("open", LOAD), [("open", "grounded")]),
        (PATCHES + wires("grounded", LOAD) + FILM, [("grounded", "grounded")]),
        (PATCHES + STRIPS + wires("grounded", "open"), [("grounded", "open")]),  # both sheets in the face's plane
        (BACKED + wires("open", "grounded") + STRIPS, [("open", "grounded")]),
        (wires("open", "joined") + wires("joined", "open"), [("open", "joined"), ("joined", "open")]),
        (wires("open", LOAD) + wires("joined", "open"), [("open", "joined"), ("joined", "open")]),
        (wires("open", "joined") + wires(LOAD, "open"), [("open", "joined"), ("joined", "open")]),
        (wires("open", "grounded") + PATCHES + wires(LOAD, "open"), [("open", "grounded"), ("grounded", "open")]),
        (wires("open", "open") + wires("open", "open"), [("open", "open")] * 2),
        (
            wires("open", "joined") + GROUP + wires("joined", "joined", table="layer.layers") + wires("joined", "open"),
            [("open", "joined"), *[("joined", "joined")] * 3, ("joined", "open")],
        ),
        (
            GROUP + wires("open", "joined", table="layer.layers") + wires("joined", "open", table="layer.layers"),
            [("open", "joined"), ("joined", "open")] * 3,
        ),
        (
            PATCHES
            + GROUP
            + wires("grounded", LOAD, table="layer.layers")
            + PATCHES.replace("[[layer]]", "[[layer.layers]]"),
            [("grounded", "grounded")] * 3,
        ),
        (
            wires("open", "joined", '["2 mm", "3 mm"]') + wires("joined", "open", '["2 mm", "3 mm"]'),
            [("open", "joined"), ("joined", "open")],
        ),
        (
            wires("open", "joined", '["2 mm", "2 mm"]') + wires("joined", "open"),
            [("open", "joined"), ("joined", "open")],
        ),
    ],
)
def test_ends_that_can_be(text, expected):
    assert kinds(text) == expected


NEEDS_CONDUCTOR = '"grounded" needs a conductor at this face, patches or a film'


@pytest.mark.parametrize(
    ("text", "fault"),
    [
        (wires("grounded", "open"), f"ends 1: {NEEDS_CONDUCTOR}; here is the front half-space"),
        (
            wires("open", "grounded"),
            f'ends 2: {NEEDS_CONDUCTOR} or back = "perfect conductor"; here is the back half-space',
        ),
        (
            BACKED + wires("open", "grounded") + PLAIN,
            f"ends 2: {NEEDS_CONDUCTOR}; here is a layer without wires that end there",
        ),
        (BACKED + wires("grounded", "open"), f"ends 1: {NEEDS_CONDUCTOR}; here is the front half-space"),
        (STRIPS + wires("grounded", "open"), f"{NEEDS_CONDUCTOR}; here are strips, which do not count, and the front"),
        (wires("open", "grounded") + wires("open", "open"), f"ends 2: {NEEDS_CONDUCTOR}; here is a layer with wires"),
        (
            PLAIN + wires("joined", "open"),
            'layer 2: wires 1: ends 1: "joined" needs wires in the next layer that end at this face; here is a layer',
        ),
        (
            wires("joined", "open"),
            'ends 1: "joined" needs wires in the next layer that end at this face; here is the front half-space',
        ),
        (
            BACKED + wires("open", "joined"),
            'ends 2: "joined" needs wires in the next layer that end at this face; here is the back half-space',
        ),
        (
            wires("open", "joined") + wires("open", "open"),
            'layer 1: wires 1: ends 2: "joined", but the end of the next layer\'s wires that faces it is "open"',
        ),
        (
            wires("open", "joined") + wires("joined", "open", '"3 mm"'),
            "layer 1: wires 1: ends 2: joined to wires of another cell: 2 mm by 2 mm here, 3 mm by 3 mm there; "
            "joined wires need the same pitch",
        ),
        (
            wires("open", "joined", '["2 mm", "3 mm"]') + wires("joined", "open", '["3 mm", "2 mm"]'),
            "joined to wires of another cell: 2 mm by 3 mm here, 3 mm by 2 mm there",
        ),
        (
            wires("open", "open") + wires(LOAD, "open"),
            "layer 2: wires 1: ends 1: a load needs a conductor at this face, patches or a film, or a facing end "
            '"joined" in the next layer; here is a layer with wires',
        ),
        (
            wires("open", LOAD),
            'ends 2: a load needs a conductor at this face, patches or a film or back = "perfect conductor"',
        ),
    ],
)
def test_one_end_that_cannot_be_is_told_with_what_its_face_offers(text, fault):
    assert fault in the_fault_of(text + SWEEP)


@pytest.mark.parametrize(
    ("text", "faults"),
    [
        (
            wires("open", "joined") + PATCHES + wires("joined", "open"),
            ['"joined", but a sheet (patches) lies between, which wires do not cross; use "grounded" on both sides']
            * 2,
        ),
        (
            wires("open", "joined") + STRIPS + wires("joined", "open"),
            ['"joined", but a sheet (strips) lies between, which wires do not cross; use "open" on both sides'] * 2,
        ),
        (wires("open", LOAD) + wires(LOAD, "open"), ['a load faces a load; write one of the two ends as "joined"'] * 2),
        (
            wires("open", LOAD) + wires("joined", "open", '"3 mm"'),
            ["2 mm by 2 mm here, 3 mm by 3 mm there", "3 mm by 3 mm here, 2 mm by 2 mm there"],
        ),
        (
            GROUP + wires("joined", "joined", table="layer.layers"),
            [
                'ends 1: "joined" needs wires in the next layer that end at this face; here is the front half-space; '
                "the repeats of a group are all alike: write the layers that differ, often the first and the last "
                "repeat, out as entries of their own",
                'ends 2: "joined" needs wires in the next layer that end at this face; here is the back half-space; '
                "the repeats of a group",
            ],
        ),
    ],
)
def test_two_ends_that_cannot_be_are_both_told(text, faults):
    found = faults_of(text + SWEEP)
    assert len(found) == len(faults)
    for expected, fault in zip(faults, found, strict=True):
        assert expected in fault


def test_a_load_must_mean_the_same_in_every_repeat():
    repeated = wires("joined", LOAD, table="layer.layers")
    fault = the_fault_of(BACKED + wires("open", "joined") + GROUP + repeated + SWEEP)
    assert (
        "ends 2: the load is joined in one repeat and grounded in another; the repeats of a group are all alike"
        in fault
    )


def test_a_neighbour_with_a_fault_of_its_own_is_not_blamed_on_the_joint():
    broken = wires("joined", "open").replace('pitch = "2 mm"', "pitch = 2")
    assert "pitch: 2 has no unit" in the_fault_of(wires("open", "joined") + broken + SWEEP)
    assert 'did you mean "patches"' in the_fault_of(
        PATCHES.replace("patches", "pathces") + wires("grounded", "open") + SWEEP
    )
    assert "repeat: 0; it must be at least 1" in the_fault_of(
        wires("open", "joined") + GROUP.replace("3", "0") + wires("joined", "open", table="layer.layers") + SWEEP
    )


def test_a_neighbour_whose_thickness_is_wrong_still_offers_its_wires():
    broken = wires("open", "open").replace('thickness = "1 mm"', "thickness = 1")
    first, second = faults_of(wires("open", "joined") + broken + SWEEP)
    assert 'the end of the next layer\'s wires that faces it is "open"' in first
    assert "layer 2: thickness: 1 has no unit" in second


def test_patches_with_a_fault_of_their_own_are_a_conductor_still():
    assert "gap" in the_fault_of(PATCHES.replace("0.2 mm", "0.2 GHz") + wires("grounded", "open") + SWEEP)
