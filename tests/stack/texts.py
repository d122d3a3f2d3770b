"""Stack texts, and what is wrong with one; several tests share them."""

import pytest

from slabsim.errors import StackError
from slabsim.stack.reader import parse_stack

WINDOW = """\
title = "Ka-band window: copper wire slab between foam skins"
front = "vacuum"
back = "vacuum"

[material.foam]
permittivity = 1.07
loss_tangent = 2e-4
[material.copper]
conductivity = "5.8e7 S/m"
[material.gold]
drude = { plasma = "1.37e16 rad/s", collision = "4.05e13 rad/s", background = 1.0 }
[material.polymer]
table = "polymer.csv"
[material.rings]
permittivity = 2.2
permeability = { resonance = "10 GHz", strength = 0.3, damping = "0.1 GHz" }
[material.ferrite]
permittivity = 12
permeability = 1.5
[material.water]
debye = { static = 78, infinity = 5.2, relaxation = "8.3 ps" }
[material.crystal]
lorentz = { background = 2.1, oscillators = [ { resonance = "1 THz", strength = 0.4, damping = "20 GHz" } ] }
[material.silica]
sellmeier = { B = [0.6961663, 0.4079426], C = ["0.0684043 um", "0.1162414 um"], range = ["0.21 um", "3.71 um"] }
[material.doped]
permittivity = -11.7
conductivity = "20 S/cm"

[[layer]]
name = "skin"
material = "foam"
thickness = "0.5 mm"

[[layer]]
patches = { period = "2 mm", gap = "0.2 mm" }

[[layer]]
name = "wire slab"
material = "foam"
thickness = "10 mm"
[[layer.wires]]
axis = "z"
pitch = "2 mm"
radius = "50 um"
metal = "copper"
ends = ["grounded", "joined"]
plasma = "lattice"

[[layer]]
name = "upper"
material = "rings"
thickness = "4 mm"
[[layer.wires]]
pitch = ["2 mm", "2 mm"]
radius = "0.1 mm"
metal = "perfect conductor"
ends = [{ resistance = "50 ohm", inductance = "1 nH" }, { capacitance = "0.1 pF" }]
plasma = "12.3 GHz"

[[layer]]
name = "absorber"
film = { sheet_resistance = "377 ohm" }

[[layer]]
repeat = 6
[[layer.layers]]
material = "ferrite"
thickness = "1 mm"
[[layer.layers]]
repeat = 2
[[layer.layers.layers]]
material = "polymer"
thickness = "2 mm"
[[layer.layers.layers]]
strips = { period = "2 mm", width = "0.1 mm" }

[[layer]]
film = { conductivity = "5.8e7 S/m", thickness = "20 nm" }

[sweep]
spectrum = { from = "5 GHz", to = "40 GHz", points = 351 }
angle = { from = "0 deg", to = "80 deg", points = 81 }
azimuth = { values = ["90 deg", "0 deg"] }
polarization = "TM"
model = "local"
store = ["amplitude"]
"""

POLYMER = "frequency (GHz),eps_re,eps_im\n1,2.3,0.001\n100,2.25,0.002\n"

SLAB = """\
[material.foam]
permittivity = 1.07
[material.copper]
conductivity = "5.8e7 S/m"
[[layer]]
name = "slab"
material = "foam"
thickness = "10 mm"
[[layer.wires]]
pitch = "2 mm"
radius = "50 um"
metal = "copper"
ends = ["open", "open"]
[sweep]
spectrum = "10 GHz"
angle = "30 deg"
"""

GEOMETRIES = """\
title = "every geometry"
[material.copper]
conductivity = "5.8e7 S/m"
[material.crystal]
permittivity = { xx = 2.0, yy = 3.0, zz = 4.0 }
loss_tangent = 0.001
permeability = { xx = 1, yy = { resonance = "30 GHz", strength = 0.3, damping = "0.1 GHz" }, zz = 1.5 }

[[layer]]
name = "crossed"
material = "crystal"
thickness = "4 mm"
rotation = "-30 deg"
[[layer.wires]]
axis = { tilt = "20 deg", azimuth = "45 deg" }
pitch = ["2 mm", "3 mm"]
radius = "50 um"
metal = "copper"
ends = ["open", { resistance = "50 ohm" }]
inductance = "host"
[[layer.wires]]
axis = "y"
pitch = "2 mm"
radius = "50 um"
metal = "perfect conductor"
[[layer.wires]]
axis = { tilt = "90 deg", azimuth = "0.5 rad" }
pitch = "2 mm"
radius = "50 um"
metal = "copper"
plasma = "9 GHz"

[[layer]]
patches = { period = "2 mm", gap = "0.2 mm" }

[[layer]]
name = "mesh"
material = "vacuum"
thickness = "8 mm"
[layer.mesh]
pitch = "2 mm"
radius = "50 um"
metal = "copper"
ends = ["grounded", "joined"]
stiffness = 2.1
plasma = "gap"
inductance = "vacuum"

[[layer]]
material = "vacuum"
thickness = "3 mm"
[[layer.wires]]
pitch = "2 mm"
radius = "50 um"
metal = "copper"
ends = ["joined", "open"]

[[layer]]
name = "front grid"
grid = { axis = "x", pitch = "2 mm", radius = "50 um", metal = "copper" }
[[layer]]
grid = { axis = { azimuth = "30 deg" }, pitch = "2 mm", radius = "50 um", metal = "perfect conductor" }

[[layer]]
name = "vent"
thickness = "6 mm"
plates = { spacing = "4 mm", normal = "y", filling = "vacuum" }

[sweep]
spectrum = { from = "5 GHz", to = "20 GHz", points = 16 }
angle = { from = "0 deg", to = "60 deg", points = 7 }
azimuth = { values = ["0 deg", "90 deg"] }
"""

SWEEP = '[sweep]\nspectrum = "10 GHz"\nangle = "30 deg"\n'


def faults_of(text, tables=None):
    """Texts of all faults of a stack text."""
    with pytest.raises(StackError) as caught:
        parse_stack(text, tables=tables or {"polymer.csv": POLYMER})
    return [str(fault) for fault in caught.value.faults]


def the_fault_of(text, tables=None):
    """Text of the only fault."""
    faults = faults_of(text, tables)
    assert len(faults) == 1, faults
    return faults[0]
