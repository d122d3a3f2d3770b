"""Every geometry of wires, and what surrounds them, as a stack file says it."""

import numpy as np
import pytest
from numpy.testing import assert_allclose

from slabsim.errors import StackError
from slabsim.stack.reader import parse_stack
from tests.stack.texts import SWEEP, faults_of, the_fault_of

METAL = '[material.copper]\nconductivity = "5.8e7 S/m"\n'
WIRES = '[[layer.wires]]\npitch = "2 mm"\nradius = "50 um"\nmetal = "copper"\n'
LAYER = '[[layer]]\nmaterial = "vacuum"\nthickness = "4 mm"\n'
MESH = LAYER + 'mesh = { pitch = "2 mm", radius = "50 um", metal = "copper"MORE }\n'
GRID = '[[layer]]\ngrid = { axis = "x", pitch = "2 mm", radius = "50 um", metal = "copper" }\n'
PLATES = '[[layer]]\nthickness = "6 mm"\nplates = { spacing = "4 mm", normal = "y" }\n'
MESH_IN_GLASS = MESH.replace("MORE", "").replace("vacuum", "glass")
PLATES_OF_GLASS = PLATES.replace('"y"', '"y", filling = "glass"')


def elements(text):
    return parse_stack(METAL + text + SWEEP).flatten()


@pytest.mark.parametrize(
    ("axis", "direction"),
    [
        ('"x"', (1, 0, 0)),
        ('"y"', (0, 1, 0)),
        ('"z"', (0, 0, 1)),
        ('{ tilt = "0 deg" }', (0, 0, 1)),
        ('{ tilt = "90 deg", azimuth = "90 deg" }', (0, 1, 0)),
        ('{ tilt = "90 deg", azimuth = "-180 deg" }', (-1, 0, 0)),
        ('{ tilt = "90 deg", azimuth = "270 deg" }', (0, -1, 0)),
    ],
)
def test_right_angles_are_exact(axis, direction):
    (layer,) = elements(LAYER + WIRES + f"axis = {axis}\n")
    assert layer.wires[0].direction == direction


def test_a_tilted_direction_is_read_from_z_and_from_x():
    (layer,) = elements(LAYER + WIRES + 'axis = { tilt = "30 deg", azimuth = "60 deg" }\n')
    assert_allclose(layer.wires[0].direction, (0.25, np.sqrt(3) / 4, np.sqrt(3) / 2), rtol=1e-15)


def test_several_sets_keep_their_order_and_their_ends():
    text = LAYER + WIRES + 'axis = "x"\n' + WIRES + 'axis = { tilt = "20 deg" }\n' + WIRES + 'inductance = "host"\n'
    patches = '[[layer]]\npatches = { period = "2 mm", gap = "0.2 mm" }\n'
    layer = elements(text + 'ends = ["open", "grounded"]\n' + patches)[0]
    assert [wires.crosses_faces for wires in layer.wires] == [False, True, True]
    assert [wires.inductance for wires in layer.wires] == ["vacuum", "vacuum", "host"]
    assert [tuple(end.kind for end in wires.ends) for wires in layer.wires[1:]] == [
        ("open", "open"),
        ("open", "grounded"),
    ]


def test_a_mesh_is_read_with_and_without_a_stiffness():
    (layer,) = elements(MESH.replace("MORE", ""))
    assert (layer.mesh.pitch, layer.mesh.radius, layer.mesh.stiffness) == (2e-3, 50e-6, None)
    assert [end.kind for end in layer.mesh.ends] == ["open", "open"]
    (layer,) = elements(MESH.replace("MORE", ", stiffness = 1.8"))
    assert layer.mesh.stiffness == 1.8


def test_grids_and_plates_are_read():
    grid, plates = elements(GRID + PLATES)
    assert (grid.direction, grid.pitch, grid.metal.name) == ((1, 0, 0), 2e-3, "copper")
    assert (plates.thickness, plates.spacing, plates.normal, plates.filling.name) == (6e-3, 4e-3, "y", "vacuum")
    (slanted,) = elements(GRID.replace('"x"', '{ azimuth = "30 deg" }'))
    assert_allclose(slanted.direction, (np.sqrt(3) / 2, 0.5, 0.0), rtol=1e-15)


def test_materials_may_differ_along_the_axes():
    host = (
        "[material.crystal]\npermittivity = { xx = 2.0, yy = 3.0, zz = 4.0 }\nloss_tangent = 0.1\n"
        'permeability = { xx = 1, yy = { resonance = "10 GHz", strength = 0.3, damping = "0.1 GHz" }, zz = 1 }\n'
    )
    (layer,) = elements(host + LAYER.replace("vacuum", "crystal") + 'rotation = "30 deg"\n')
    assert_allclose(layer.material.permittivity_axes(1e9), np.array([2, 3, 4]) * (1 + 0.1j), rtol=1e-15)
    mu = layer.material.permeability_axes(1e9)
    assert mu[0] == mu[2] == 1.0
    assert_allclose(mu[1], 1 - 0.3 * 1 / (1 - 100 + 0.1j), rtol=1e-12)
    assert_allclose(layer.rotation, np.pi / 6, rtol=1e-15)


@pytest.mark.parametrize(
    "text",
    [
        LAYER + WIRES + 'ends = ["open", "joined"]\n' + MESH.replace("MORE", ', ends = ["joined", "open"]'),
        LAYER
        + 'rotation = "40 deg"\n'
        + WIRES
        + 'axis = { tilt = "20 deg" }\nends = ["open", "joined"]\n'
        + LAYER
        + WIRES
        + 'axis = { tilt = "20 deg", azimuth = "40 deg" }\nends = ["joined", "open"]\n',
    ],
)
def test_joints_go_by_direction_and_cell(text):
    first, second = elements(text)
    assert first.wires[0].ends[1].kind == "joined"
    wires = second.mesh or second.wires[0]
    assert wires.ends[0].kind == "joined"


def test_crossed_sets_are_joined_each_to_its_own_direction():
    one, other = (f'axis = {{ tilt = "20 deg", azimuth = "{a} deg" }}\nends = ["ENDS]\n' for a in (0, 180))
    front = LAYER + WIRES + one + WIRES + other
    back = LAYER + WIRES + other + WIRES + one
    layers = elements(front.replace("ENDS", 'open", "joined"') + back.replace("ENDS", 'joined", "open"'))
    assert all(wires.ends[1].kind == "joined" for wires in layers[0].wires)


def sets(*ends):
    """A layer with one set of wires along z for each pair of ends."""
    return LAYER + "".join(f'{WIRES}ends = ["{front}", "{back}"]\n' for front, back in ends)


FORWARD, BACKWARD, FREE = ("open", "joined"), ("joined", "open"), ("open", "open")


def test_sets_alike_are_joined_in_the_order_of_the_file_whatever_open_ones_stand_between():
    for text in (
        sets(FREE, FORWARD) + sets(BACKWARD),
        sets(FORWARD) + sets(FREE, BACKWARD),
        sets(FORWARD, FREE, FORWARD) + sets(BACKWARD, BACKWARD),
    ):
        first, second = elements(text)
        joined = [
            sum(one.ends[side].kind == "joined" for one in layer.wires) for layer, side in ((first, 1), (second, 0))
        ]
        assert joined[0] == joined[1] > 0


@pytest.mark.parametrize(
    ("text", "place"),
    [
        (sets(FORWARD, FORWARD) + sets(BACKWARD), "layer 1: wires 2: ends 2: "),
        (sets(FORWARD) + sets(BACKWARD, BACKWARD), "layer 2: wires 2: ends 1: "),
    ],
)
def test_a_set_that_finds_no_partner_left_is_refused(text, place):
    fault = the_fault_of(METAL + text + SWEEP)
    assert place in fault
    assert (
        "joined, but every set of this direction and cell in the next layer is joined to another set already; "
        "each set needs a partner of its own"
    ) in fault


def test_a_set_that_finds_only_an_open_one_left_is_told_so():
    fault = the_fault_of(METAL + sets(FORWARD, FORWARD) + sets(FREE, BACKWARD) + SWEEP)
    assert 'layer 1: wires 2: ends 2: "joined", but the end of the next layer\'s wires that faces it is "open"' in fault


@pytest.mark.parametrize(
    ("text", "fault"),
    [
        (
            LAYER
            + 'rotation = "30 deg"\n'
            + WIRES
            + 'axis = { tilt = "20 deg" }\nends = ["open", "joined"]\n'
            + LAYER
            + WIRES
            + 'axis = { tilt = "20 deg" }\nends = ["joined", "open"]\n',
            "joined to wires of another direction: tilt 20 deg, azimuth 30 deg here, tilt 20 deg, azimuth 0 deg there; "
            "joined wires need the same axis, the rotation of their layers included",
        ),
        (
            LAYER + WIRES + 'ends = ["open", "joined"]\n' + LAYER + WIRES + 'axis = "x"\n',
            '"joined" needs wires in the next layer that end at this face; '
            "here is a layer without wires that end there",
        ),
        (
            LAYER + WIRES + 'ends = ["open", "joined"]\n' + PLATES,
            '"joined" needs wires in the next layer that end at this face; here is a layer of plates',
        ),
        (
            LAYER + WIRES + 'ends = ["open", "grounded"]\n' + GRID,
            '"grounded" needs a conductor at this face, patches or a film or back = "perfect conductor"; '
            "here is a grid, which does not count, and the back half-space",
        ),
        (
            MESH.replace("MORE", "") + WIRES,
            "layer 1: wires and mesh in one layer; a layer has either sets of wires or a mesh",
        ),
        (MESH.replace("MORE", ", stiffness = 0.0"), "layer 1: mesh.stiffness: 0.0; it must be greater than 0"),
        (
            MESH.replace("MORE", ', axis = "x"'),
            'layer 1: mesh.axis: unknown key; did you mean "radius"?',
        ),
        (
            MESH.replace("MORE", "").replace("50 um", "1 mm"),
            'mesh.radius: "1 mm" with pitch "2 mm": neighbouring wires touch',
        ),
        (GRID.replace("50 um", "1 mm"), 'grid.radius: "1 mm" with pitch "2 mm": neighbouring wires touch'),
        (GRID.replace('"x"', '"z"'), 'grid.axis: "z"; allowed are "x", "y"'),
        (GRID.replace("metal", "mtal"), 'grid.mtal: unknown key; did you mean "metal"?'),
        (GRID.replace("copper", "silver"), 'grid.metal: material "silver" is not defined'),
        (
            PLATES.replace("6 mm", "1 mm"),
            'thickness "1 mm" with spacing "4 mm": the two edges of the plates would see each other\'s near fields, '
            "and they are solved one by one; the thickness must be at least 2 mm",
        ),
        (GRID + 'thickness = "1 mm"\n', "layer 1: grid and thickness in one entry; an entry is either a layer"),
        (GRID.replace('"x"', '"w"'), 'grid.axis: "w"; allowed are "x", "y", or a table { azimuth }'),
        (PLATES.replace("normal", "norml"), 'plates.norml: unknown key; did you mean "normal"?'),
        (PLATES + 'rotation = "30 deg"\n', "layer 1: plates and rotation in one entry; an entry is either a layer"),
        (PLATES.replace('"y"', '"z"'), 'plates.normal: "z"; allowed are "x", "y"'),
        (PLATES + 'material = "copper"\n', "layer 1: plates and material in one entry; an entry is either a layer"),
        (LAYER + 'rotaton = "40 deg"\n', 'layer 1: rotaton: unknown key; did you mean "rotation"?'),
        (LAYER + 17 * (WIRES + 'axis = "x"\n'), "layer 1: wires: 17 items; it must have at most 16"),
        (
            MESH.replace("MORE", ', ends = ["open", "joined"]')
            + MESH.replace("MORE", ', ends = ["joined", "open"]').replace("2 mm", "3 mm"),
            "layer 1: mesh.ends 2: joined to wires of another cell: 2 mm by 2 mm here, 3 mm by 3 mm there; joined "
            "wires need the same pitch",
        ),
        (
            MESH.replace("MORE", ', ends = ["open", "joined"]')
            + LAYER
            + WIRES
            + 'axis = { tilt = "20 deg" }\nends = ["joined", "open"]\n',
            "layer 1: mesh.ends 2: joined to wires of another direction: tilt 0 deg here, tilt 20 deg, azimuth 0 deg",
        ),
        (
            MESH.replace("MORE", ', ends = ["grounded", "open"]'),
            "layer 1: mesh.ends 1: " + '"grounded" needs a conductor',
        ),
        (
            LAYER + WIRES + 'ends = ["open", { resistance = "5 ohm" }]\n' + PLATES,
            "wires 1: ends 2: a load needs a conductor at this face, patches or a film, or a facing end "
            '"joined" in the next layer; here is a layer of plates',
        ),
        (LAYER + 'rotation = "400 deg"\n', 'rotation: "400 deg"; an azimuth must lie between -360 deg and 360 deg'),
    ],
)
def test_what_cannot_be_is_told_with_place_and_cure(text, fault):
    assert fault in the_fault_of(METAL + text + SWEEP)


@pytest.mark.parametrize(
    ("place", "fault"),
    [
        ('front = "crystal"\n', 'front: "crystal" is anisotropic; the front half-space must be isotropic'),
        ('back = "crystal"\n', 'back: "crystal" is anisotropic; the back half-space must be isotropic'),
    ],
)
def test_anisotropic_half_spaces_are_refused(place, fault):
    crystal = "[material.crystal]\npermittivity = { xx = 2.0, yy = 2.0, zz = 4.0 }\n"
    assert fault in the_fault_of(place + crystal + LAYER + SWEEP)


def test_three_equal_axes_are_one():
    ring = '{ resonance = "30 GHz", strength = 0.3, damping = "0.1 GHz" }'
    glass = "[material.glass]\npermittivity = { xx = 2.0, yy = 2.0, zz = 2.0 }\nloss_tangent = 0.1\n"
    (layer,) = elements(glass + f"permeability = {{ xx = {ring}, yy = {ring}, zz = {ring} }}\n" + MESH_IN_GLASS)
    assert layer.material.is_isotropic
    assert_allclose(layer.material.permittivity(1e9), 2.0 + 0.2j, rtol=1e-15)
    assert_allclose(layer.material.permeability(1e9), 1 - 0.3 / (1 - 900 + 0.1j), rtol=1e-12)
    clear = glass.replace("loss_tangent = 0.1\n", "permeability = { xx = 1, yy = 1, zz = 1 }\n")
    stack = parse_stack('front = "glass"\nback = "glass"\n' + METAL + clear + PLATES_OF_GLASS + SWEEP)
    assert not stack.front.is_magnetic


@pytest.mark.parametrize(
    ("axes", "faults"),
    [
        (
            "permittivity = { xx = 2.0, yy = 2.0 }",
            ["material.glass: permittivity.zz: missing; Along z, across the layer"],
        ),
        (
            'permittivity = { xx = "2", yy = 2.0, zz = 2.0 }',
            ['permittivity.xx: "2"; it must be a plain number without quotes (remove the quotes)'],
        ),
        ("permittivity = { xx = 2.0, yy = 2.0, z = 2.0 }", ['permittivity.z: unknown key; did you mean "zz"?']),
        (
            "permittivity = 2.0\npermeability = { x = 1, y = 1, z = 1 }",
            [f'permeability.{key}: unknown key; did you mean "{key}{key}"?' for key in "xyz"],
        ),
        (
            'permittivity = 2.0\npermeability = { xx = 1, yy = { resonance = "1 GHz", strength = 0.1 }, zz = 1 }',
            ['permeability.yy.damping: missing; Damping G, such as "0.1 GHz"'],
        ),
    ],
)
def test_axes_that_cannot_be_are_told_by_their_names(axes, faults):
    found = faults_of(f"[material.glass]\n{axes}\n" + LAYER.replace("vacuum", "glass") + SWEEP)
    assert len(found) == len(faults)
    for fault, one in zip(faults, found, strict=True):
        assert fault in one


def test_anisotropic_metals_hosts_of_meshes_and_fillings_are_refused():
    crystal = "[material.crystal]\npermittivity = { xx = 2.0, yy = 2.0, zz = 4.0 }\n"
    cases = {
        MESH.replace("MORE", "").replace("vacuum", "crystal"): 'material: "crystal" is anisotropic; the host of a mesh',
        PLATES.replace(
            '"y"', '"y", filling = "crystal"'
        ): 'plates.filling: "crystal" is anisotropic; the filling of plates',
        GRID.replace("copper", "crystal"): 'grid.metal: "crystal" is anisotropic; the metal of wires must be isotropic',
    }
    for text, fault in cases.items():
        assert fault in the_fault_of(METAL + crystal + text + SWEEP)


def test_gain_along_one_axis_is_found():
    crystal = "[material.crystal]\npermittivity = { xx = 2.0, yy = 2.0, zz = -4.0 }\nloss_tangent = 0.1\n"
    fault = the_fault_of(crystal + LAYER.replace("vacuum", "crystal") + SWEEP)
    assert "Im(eps_zz) < 0 at 10 GHz: the material would amplify" in fault


def test_plates_refuse_planes_of_incidence_that_are_slanted():
    sweep = SWEEP + 'azimuth = { values = ["0 deg", "45 deg", "90 deg"] }\n'
    assert (
        "sweep: azimuth: 45 deg with plates in the stack: the reflection of their edge is known for planes of "
        "incidence along and across the plates; every azimuth must be a multiple of 90 deg"
    ) in the_fault_of(PLATES + sweep)
    assert parse_stack(PLATES + SWEEP + 'azimuth = "90 deg"\n').sweep.azimuths_deg == [90.0]


def test_stacks_that_mix_polarizations_know_it():
    for text, mixes in (
        (LAYER + WIRES, False),
        (LAYER + WIRES + 'axis = { tilt = "5 deg" }\n', True),
        (LAYER + WIRES + 'axis = "x"\n', True),
        (MESH.replace("MORE", ""), False),
        (GRID, True),
        (PLATES, False),
    ):
        stack = parse_stack(METAL + text + SWEEP)
        assert stack.mixes_polarizations is mixes
        assert stack.channels == (("TE", "TM", "TE_to_TM", "TM_to_TE") if mixes else ("TE", "TM"))


def test_every_fault_of_a_file_is_told_at_once():
    text = METAL + GRID.replace("2 mm", "2 mn") + PLATES.replace('"y"', '"w"') + MESH.replace("MORE", ", stiff = 1")
    with pytest.raises(StackError) as caught:
        parse_stack(text + SWEEP)
    assert len(caught.value.faults) == 3
