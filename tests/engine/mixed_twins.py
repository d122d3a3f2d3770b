"""Stacks whose polarizations mix, written twice: as slabsim's own model, and as plain numbers for the reference."""

from dataclasses import replace

import mpmath as mp
import numpy as np

from slabsim.materials.material import VACUUM, Material
from slabsim.stack.directions import tilted
from slabsim.stack.sample import Grid, Layer, Mesh, Stack, Strips, WireEnd, WireSet
from tests.engine import twins
from tests.engine.twins import C0, GROUNDED, JOINED, OPEN, medium
from tests.reference import grids, lattice, mixed
from tests.reference.layers import digits_of_growth
from tests.reference.mixed_layers import mean_across, mixed_generator


def axes_medium(eps, mu=None, name="crystal") -> Material:
    """Material with three constant eps, and three constant mu or none."""
    return Material(
        name,
        tuple(twins.Fixed(complex(v)) for v in eps),
        None if mu is None else tuple(twins.Fixed(complex(v)) for v in mu),
    )


def reference(sample: Stack, frequency: float, angle_deg: float, azimuth_deg: float, model: str = "nonlocal"):
    """The dense solution of the same stack at one point."""
    k0 = 2 * mp.pi * mp.mpf(frequency) / C0
    front = twins._half_space(sample.front, frequency)
    back = "perfect conductor" if sample.back is None else twins._half_space(sample.back, frequency)
    theta, phi = mp.mpf(angle_deg) * mp.pi / 180, mp.mpf(azimuth_deg) * mp.pi / 180
    kt = mp.sqrt(front.eps * front.mu) * mp.sin(theta)
    flat = sample.flatten()
    elements = [_element(flat, i, sample, frequency, k0, kt, phi) for i in range(len(flat))]
    return mixed.solve_mixed(front, elements, back, k0, theta, phi, model)


def _element(flat, i, sample, frequency, k0, kt, phi):
    element = flat[i]
    if isinstance(element, Layer):
        return _slab(element, frequency, k0)
    sides = _neighbours(flat, i, sample)
    if isinstance(element, Grid):
        return _grid(element, sides, frequency, k0, kt, phi)
    eps = [_mean(side, frequency) for side in sides]
    sheet = twins._sheet(element, *eps, k0, kt)
    c, s = mp.cos(phi), mp.sin(phi)
    y_tm, y_te = mp.mpmathify(sheet.y_tm), mp.mpmathify(sheet.y_te)
    return mixed.TensorSheet((y_tm * c**2 + y_te * s**2, (y_tm - y_te) * c * s, y_tm * s**2 + y_te * c**2))


def _neighbours(flat, i, sample):
    before = [e.material for e in flat[:i] if isinstance(e, Layer)]
    after = [e.material for e in flat[i + 1 :] if isinstance(e, Layer)]
    first = before[-1] if before else sample.front
    return first, after[0] if after else (sample.back or first)


def _axes(material: Material, frequency: float):
    eps, mu = material.permittivity_axes(frequency), material.permeability_axes(frequency)
    return tuple(complex(v) for v in eps), tuple(complex(v) for v in mu)


def _mean(material: Material, frequency: float):
    (x, y, z), _ = _axes(material, frequency)
    return x if x == y == z else complex(mp.sqrt(z) * mp.sqrt(mp.sqrt(x) * mp.sqrt(y)))


def _grid(grid, sides, frequency, k0, kt, phi):
    c, s = grid.direction[:2]
    along, across = float(kt * (c * mp.cos(phi) + s * mp.sin(phi))), float(kt * (c * mp.sin(phi) - s * mp.cos(phi)))
    eps, mu = zip(*(twins._values(side, frequency) for side in sides), strict=True)
    z = grids.spectral_grid(grid.pitch, grid.radius, float(k0), along, across, eps, mu)
    if grid.metal is not None:
        metal = twins._values(grid.metal, frequency)[0]
        impedance = lattice.round_wire_impedance(metal, grid.radius, k0, sum(eps) / 2)
        z = z + complex(impedance) * grid.pitch / float(lattice.ETA0)
    return mixed.TensorSheet((c * c / z, c * s / z, s * s / z))


def _slab(layer: Layer, frequency: float, k0):
    eps, mu = _axes(layer.material, frequency)
    sets = tuple(_set(wires, layer.material, eps, mu, frequency, k0) for wires in layer.wires)
    mesh = None if layer.mesh is None else _mesh(layer.mesh, layer.material, eps, mu, frequency, k0)
    return mixed.MixedSlab(eps, mu, layer.thickness, sets, mesh, layer.rotation)


def _set(wires: WireSet, host, eps, mu, frequency, k0):
    n = wires.direction
    along = sum(c**2 * e for c, e in zip(n, eps, strict=True))
    array = twins._array(wires, along, frequency, k0)
    inductance = mean_across(mu, n) if wires.inductance == "host" else 1
    return mixed.Set(array.kp, n, array.zeta, array.front, array.back, inductance)


def _mesh(mesh: Mesh, host, eps, mu, frequency, k0):
    as_set = WireSet((mesh.pitch, mesh.pitch), mesh.radius, mesh.metal, mesh.ends, mesh.plasma)
    array = twins._array(as_set, eps[2], frequency, k0)
    l0 = mesh.stiffness
    if l0 is None:
        # brute sum of J0^2/n^2 to 2e5 terms; the rest by its mean, J0^2 -> 1/(pi x)
        from scipy.special import j0

        n, x = np.arange(1, 200_001), 2 * np.pi * mesh.radius / mesh.pitch
        total = float(np.sum((j0(n * x) / n) ** 2)) + 1 / (np.pi * x * 2 * n[-1] ** 2.0)
        l0 = 3 / (1 + 4 * (float(array.kp) * mesh.pitch / (2 * np.pi)) ** 2 * total)
    inductance = mu[2] if mesh.inductance == "host" else 1
    return mixed.MeshArray(array.kp, l0, array.zeta, array.front, array.back, inductance)


# --- random stacks -----------------------------------------------------------------------------------


def random_mixed_stack(rng: np.random.Generator, lossless: bool = False):
    """A stack with every kind of layer and sheet; frequency [Hz], angle and azimuth [degrees]."""
    frequency = 10 ** rng.uniform(9, 10.5)
    wavelength = C0 / frequency
    n_layers = int(rng.integers(1, 4))
    layers = [_random_layer(rng, wavelength, lossless) for _ in range(n_layers)]
    metal_back = rng.random() < 0.2
    back = None if metal_back else medium(rng.uniform(1, 4) + (0 if lossless else 1j * rng.choice([0, 0.1])))
    front = VACUUM if rng.random() < 0.5 else medium(rng.uniform(1, 3), rng.choice([1.0, 1.5]))
    dressed = _dress(rng, layers, metal_back, wavelength, lossless)
    elements = [_bounded(one, frequency) if isinstance(one, Layer) else one for one in dressed]
    angle = float(rng.choice([0.0, rng.uniform(0, 89), 89.99], p=[0.1, 0.8, 0.1]))
    azimuth = float(rng.choice([0.0, 90.0, rng.uniform(-180, 180)], p=[0.1, 0.1, 0.8]))
    return twins.stack(*elements, front=front, back=back), frequency, angle, azimuth


def _random_layer(rng, wavelength, lossless):
    thickness = wavelength * 10 ** rng.uniform(*[(-1.5, 0.3), (-5, -2), (0.3, 0.6)][rng.choice(3, p=[0.75, 0.15, 0.1])])
    pitch = wavelength * 10 ** rng.uniform(-2, -0.5)
    thickness = min(thickness, 20 * pitch)  # decays of up to about exp(-100), for the sake of the reference
    kind = rng.choice(["bare", "sets", "mesh"], p=[0.2, 0.6, 0.2])
    if kind == "mesh":
        metal = None if lossless or rng.random() < 0.4 else twins._random_metal(rng, wavelength)
        stiffness = None if rng.random() < 0.5 else rng.uniform(0.5, 3)
        radius = pitch * 10 ** rng.uniform(-3, -0.9)
        mesh = Mesh(pitch, radius, metal, (OPEN, OPEN), "lattice", stiffness, rng.choice(["vacuum", "host"]))
        return Layer("mesh", twins._random_medium(rng, lossless), thickness, mesh=mesh)
    material = _random_axes(rng, lossless) if rng.random() < 0.5 else twins._random_medium(rng, lossless)
    count = 0 if kind == "bare" else int(rng.choice([1, 2, 3], p=[0.6, 0.3, 0.1]))
    wires = tuple(_random_set(rng, wavelength, pitch * rng.uniform(0.7, 1.4), lossless) for _ in range(count))
    return Layer("layer", material, thickness, wires, rotation=rng.choice([0.0, rng.uniform(-3, 3)]))


def _bounded(layer, frequency):
    """The layer, thinner if its waves decay by more than 60 digits: the reference carries them all."""
    k0 = 2 * mp.pi * frequency / C0
    growth = digits_of_growth(
        mixed_generator(_slab(layer, frequency, k0), k0, 0.5, 0.2, "nonlocal"), k0 * layer.thickness
    )
    return replace(layer, thickness=layer.thickness * min(1.0, 60.0 / max(growth, 1e-9)))


def _random_set(rng, wavelength, pitch, lossless):
    direction = {
        "flat": tilted(90.0, rng.uniform(-180, 180)),
        "x": (1.0, 0.0, 0.0),
        "z": (0.0, 0.0, 1.0),
        "tilted": tilted(rng.uniform(5, 70), rng.uniform(-180, 180)),
    }[rng.choice(["flat", "x", "z", "tilted"])]
    metal = None if lossless or rng.random() < 0.4 else twins._random_metal(rng, wavelength)
    cell = (pitch, pitch) if rng.random() < 0.6 else (pitch, pitch * rng.uniform(0.5, 2))
    radius = min(cell) * 10 ** rng.uniform(-3, -0.9)
    return WireSet(cell, radius, metal, (OPEN, OPEN), "lattice", direction, rng.choice(["vacuum", "host"]))


def _random_axes(rng, lossless):
    loss = 0.0 if lossless else 10 ** rng.uniform(-4, -0.5)
    # near fields of sheets run away into a host with permittivities of both signs: not without loss
    signs = np.ones(3) if lossless else rng.choice([1, -1], 3, p=[0.8, 0.2])
    eps = rng.uniform(1, 6, 3) * signs + 1j * loss * rng.uniform(0.2, 1, 3)
    mu = rng.uniform(0.5, 2, 3) + 1j * loss * rng.uniform(0.2, 1, 3)
    return axes_medium(eps, mu if rng.random() < 0.5 else None)


def _dress(rng, layers, metal_back, wavelength, lossless):
    """Ends of the wires, joints between layers with equal sets, and sheets and grids in between."""
    elements = []
    for i in range(len(layers) + 1):
        front_layer, rear_layer = (layers[i - 1] if i else None), (layers[i] if i < len(layers) else None)
        if front_layer and rear_layer and front_layer.wires and rng.random() < 0.4:
            layers[i - 1], layers[i] = _joined(rng, front_layer, rear_layer, lossless)
        else:
            sheet = _random_sheet(rng, wavelength, lossless, front_layer, rear_layer) if rng.random() < 0.5 else None
            elements.append((i, sheet))
            conductor = (sheet is not None and not isinstance(sheet, Grid | Strips)) or (
                i == len(layers) and metal_back
            )
            for k, side in ((i - 1, 1), (i, 0)):
                if conductor and 0 <= k < len(layers):
                    layers[k] = _grounded(rng, layers[k], side, lossless)
    found = []
    sheets = dict(elements)
    for i, layer in enumerate(layers):
        found += [sheets[i]] if sheets.get(i) is not None else []
        found.append(layer)
    return [*found, sheets[len(layers)]] if sheets.get(len(layers)) is not None else found


def _joined(rng, front_layer, rear_layer, lossless):
    """The rear layer takes over the sets of the front one, with other wires, and both are turned alike."""
    sets = []
    for wires in front_layer.wires:
        load = None if rng.random() < 0.6 else twins._random_load(rng, lossless)
        sets.append(replace(wires, ends=(wires.ends[0], WireEnd("joined", load))) if wires.crosses_faces else wires)
    rear = tuple(
        replace(w, radius=w.radius * rng.uniform(0.6, 1.3), ends=(JOINED, OPEN)) if w.crosses_faces else w for w in sets
    )
    front = replace(front_layer, wires=tuple(sets))
    return front, replace(rear_layer, wires=rear, mesh=None, rotation=front_layer.rotation)


def _grounded(rng, layer, side, lossless):
    def end():
        return GROUNDED if rng.random() < 0.5 else WireEnd("grounded", twins._random_load(rng, lossless))

    def held(one):
        ends = list(one.ends)
        if ends[side].kind == "open" and rng.random() < 0.7:
            ends[side] = end()
        return replace(one, ends=tuple(ends))

    wires = tuple(held(one) if one.crosses_faces else one for one in layer.wires)
    return replace(layer, wires=wires, mesh=None if layer.mesh is None else held(layer.mesh))


def _random_sheet(rng, wavelength, lossless, before, after):
    bare = all(layer is None or layer.material.is_isotropic for layer in (before, after))
    if bare and rng.random() < 0.5:
        pitch = wavelength * rng.uniform(0.02, 0.12)
        metal = None if lossless or rng.random() < 0.5 else twins._random_metal(rng, wavelength)
        return Grid("grid", pitch, pitch * 10 ** rng.uniform(-3, -1), metal, tilted(90.0, rng.uniform(-180, 180)))
    return twins._random_sheet(rng, wavelength, lossless)
