"""A made-up stack and a made-up response that is known at every point."""

from dataclasses import dataclass

import h5py
import numpy as np

from slabsim.materials.material import VACUUM
from slabsim.stack.sample import Layer, Plates, Stack, Sweep, WireEnd, WireSet
from slabsim.store import layout
from slabsim.store.writer import MapWriter
from slabsim.sweeps.plan import SweepPlan

AIR = VACUUM
TEXT = 'title = "demo"\n# radius 50 µm\n[sweep]\nmodel = "nonlocal"\n'
TABLE = "wavelength (um);n;k\n1,0;1,5;0\n"


@dataclass(frozen=True)
class Answer:
    """A response over one block."""

    r: np.ndarray
    t: np.ndarray | None
    R: np.ndarray
    T: np.ndarray | None
    A: np.ndarray


def demo_stack(n_freqs=12, n_angles=5, n_azimuths=1, *, back=AIR, text=TEXT, tables=None, model="nonlocal", **sweep):
    """A stack of one wire layer over a grid of the given size."""
    wires = WireSet((2e-3, 2e-3), 5e-5, None, (WireEnd("open"), WireEnd("open")))
    # plates look different from different azimuths, and do not mix polarizations
    turning = (Plates("plates", 6e-3, 4e-3, "y", AIR),) if n_azimuths > 1 else ()
    return Stack(
        title="demo",
        front=AIR,
        back=back,
        elements=(Layer("wire slab", AIR, 0.01, (wires,)), *turning),
        sweep=Sweep(
            np.linspace(5e9, 40e9, n_freqs),
            np.linspace(0.0, 80.0, n_angles),
            np.linspace(0.0, 90.0, n_azimuths),
            model=model,
            **sweep,
        ),
        text=text,
        file_name="demo.toml",
        tables={"polymer.csv": TABLE} if tables is None else tables,
    )


class DemoSolver:
    """A smooth response that differs from point to point; counts its calls."""

    def __init__(self, stack):
        self.codes = [("TE", "TM").index(name) for name in stack.sweep.polarizations]
        self.is_metal_backed = stack.back is None
        self.calls = []

    def __call__(self, frequencies, angles_deg, azimuth_deg):
        self.calls.append((frequencies[0], angles_deg[0], azimuth_deg))
        code = np.array(self.codes)[:, None, None]
        phase = frequencies[:, None] / 1e10 * np.cos(np.deg2rad(angles_deg)) + azimuth_deg / 100
        r = (0.3 + 0.1 * code) * np.exp(1j * phase)
        if self.is_metal_backed:
            return Answer(r, None, np.abs(r) ** 2, None, 1.0 - np.abs(r) ** 2)
        t = (0.6 - 0.1 * code) * np.exp(2j * phase)
        R, T = np.abs(r) ** 2, np.abs(t) ** 2
        return Answer(r, t, R, T, 1.0 - R - T)


def demo_plan(stack, block_shape=(5, 3)):
    """Small blocks, the last ones along each axis smaller."""
    return SweepPlan.of(stack.sweep, block_shape=block_shape)


def answer_at(stack, place):
    """The response of one block."""
    sweep = stack.sweep
    solve = DemoSolver(stack)
    azimuth_deg = sweep.azimuths_deg[place.azimuth]
    return solve(sweep.frequencies[place.frequencies], sweep.angles_deg[place.angles], azimuth_deg)


def expected(stack, name):
    """A quantity over the whole grid, shape (n_azimuths, n_polarizations, n_freqs, n_angles)."""
    quantity = next(q for q in layout.QUANTITIES if q.name == name)
    sweep = stack.sweep
    solve = DemoSolver(stack)
    return np.stack([quantity.of(solve(sweep.frequencies, sweep.angles_deg, phi)) for phi in sweep.azimuths_deg])


def write_blocks(path, stack, plan, indices, **options):
    """Start a map, write some of its blocks, leave it unfinished."""
    with MapWriter.create(path, stack, plan, **options) as writer:
        for index in indices:
            writer.write_block(index, answer_at(stack, plan.place(index)))


def write_map(path, stack, plan=None, **options):
    """Write a complete map."""
    plan = plan or demo_plan(stack)
    with MapWriter.create(path, stack, plan, **options) as writer:
        for index in range(plan.n_blocks):
            writer.write_block(index, answer_at(stack, plan.place(index)))
        writer.finish()


def contents(path):
    """Bytes of every result dataset and of the progress of a map."""
    with h5py.File(path, "r") as file:
        data = [f"{layout.DATA}/{q.name}" for q in layout.QUANTITIES if q.name in file[layout.DATA]]
        copies = [f"{layout.PLOT}/{name}" for name, item in file[layout.PLOT].items() if item.chunks]
        names = [*data, *copies, layout.BLOCK_DONE, layout.STATE, layout.DIGEST]
        return {name: np.asarray(file[name][()]).tobytes() for name in names}
