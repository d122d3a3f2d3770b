"""The layout of a map file, in one table: every dataset, where it stands and what it is called.

    /entry/data      azimuth polarization incident frequency angle, and the quantities over them
    /entry/plot      2-D copies at the first azimuth, for viewers
    /entry/process   the stack text, its tables, program versions, models
    /entry/progress  which blocks are done
    /<name>          soft links to /entry/data/<name>

Writer and reader both go by this table.
"""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np

from slabsim.errors import InputError

if TYPE_CHECKING:
    from slabsim.stack.sample import Stack, Stored
    from slabsim.store.blocks import BlockResponse

FORMAT = "1.0"

ENTRY = "/entry"
DATA = "/entry/data"
PLOT = "/entry/plot"
PROCESS = "/entry/process"
STACK_NOTE = "/entry/process/stack"
TABLE_NOTE = "table_{}"  # beside the stack note, counted from 1
ENVIRONMENT = "/entry/process/environment"
MODELS = "/entry/process/models"
PROGRESS = "/entry/progress"
STATE = "/entry/progress/state"
DIGEST = "/entry/progress/stack_sha256"
BLOCK_SHAPE = "/entry/progress/block_shape"
BLOCK_DONE = "/entry/progress/block_done"
COMPARISON = "/entry/comparison"

RUNNING, COMPLETE = "running", "complete"
PENDING, DONE, FAILED = 0, 1, 2
BLOCK_FLAGS = "pending done failed"

CHANNELS = ("TE", "TM", "TE_to_TM", "TM_to_TE")  # position is the value stored in the file
POLARIZATIONS = CHANNELS[:2]
TIME_CONVENTION = "exp(-i*omega*t)"
AMPLITUDE = (
    "complex amplitude = <name>_real + i*<name>_imag; ratio of electric-field amplitudes "
    "(TE: E.s, TM: h.s*sqrt(eps/mu) with h = eta0*H, s normal to the plane of incidence); "
    "r is referred to the front face, t to the back face"
)


@dataclass(frozen=True)
class Axis:
    """An axis: a one-dimensional dimension scale of /entry/data."""

    name: str
    dtype: str
    units: str
    long_name: str
    values: Callable[[Stack], np.ndarray]
    flag_meanings: Callable[[Stack], str] | None = None


@dataclass(frozen=True)
class Quantity:
    """A dataset over four axes.

    Parameters
    ----------
    kind : {"power", "amplitude"}
        Entry of ``sweep.store`` that asks for it.
    is_transmitted : bool
        There is none in front of a perfect conductor.
    of : callable
        The quantity of a block, float array of shape (n_channels, n_freqs, n_angles); absorptance (n_incident, ...).
    """

    name: str
    axes: tuple[str, str, str, str]
    long_name: str
    kind: Stored
    is_transmitted: bool
    of: Callable[[BlockResponse], np.ndarray]
    dtype: str = "<f8"
    units: str = "1"


def codes(channels: Sequence[str]) -> np.ndarray:
    """Channels as stored: 0 is TE, 1 is TM; 2 and 3 are TE to TM and TM to TE."""
    return np.array([CHANNELS.index(name) for name in channels], dtype="i1")


def _meanings(stack: Stack) -> str:
    return " ".join(CHANNELS if stack.mixes_polarizations else POLARIZATIONS)


def _given(values: np.ndarray | None) -> np.ndarray:
    if values is None:
        raise InputError("the block has no t or T; only a stack backed by a perfect conductor may leave them out")
    return values


_OUT = ("azimuth", "polarization", "frequency", "angle")
_IN = ("azimuth", "incident", "frequency", "angle")

AXES = (
    Axis("azimuth", "<f8", "degree", "azimuth of the plane of incidence", lambda s: s.sweep.azimuths_deg),
    Axis("polarization", "i1", "1", "polarization, in_to_out if it changes", lambda s: codes(s.channels), _meanings),
    Axis(
        "incident",
        "i1",
        "1",
        "polarization of the incident wave",
        lambda s: codes(s.sweep.polarizations),
        lambda s: " ".join(POLARIZATIONS),
    ),
    Axis("frequency", "<f8", "Hz", "frequency", lambda s: s.sweep.frequencies),
    Axis("angle", "<f8", "degree", "angle of incidence", lambda s: s.sweep.angles_deg),
)

QUANTITIES = (
    Quantity("transmittance", _OUT, "transmitted power / incident power", "power", True, lambda b: _given(b.T)),
    Quantity("reflectance", _OUT, "reflected power / incident power", "power", False, lambda b: b.R),
    Quantity("absorptance", _IN, "absorbed power / incident power", "power", False, lambda b: b.A),
    Quantity("t_real", _OUT, "Re t", "amplitude", True, lambda b: _given(b.t).real),
    Quantity("t_imag", _OUT, "Im t", "amplitude", True, lambda b: _given(b.t).imag),
    Quantity("r_real", _OUT, "Re r", "amplitude", False, lambda b: b.r.real),
    Quantity("r_imag", _OUT, "Im r", "amplitude", False, lambda b: b.r.imag),
)


def quantities(stack: Stack) -> tuple[Quantity, ...]:
    """Quantities that the map of a stack holds; the first one is the signal."""
    return tuple(
        quantity
        for quantity in QUANTITIES
        if quantity.kind in stack.sweep.store and not (quantity.is_transmitted and stack.back is None)
    )


def plotted(stack: Stack) -> Quantity:
    """Quantity that viewers show: the transmittance, or the reflectance of a metal-backed stack."""
    name = "reflectance" if stack.back is None else "transmittance"
    return next(quantity for quantity in QUANTITIES if quantity.name == name)


def plot_name(quantity: Quantity, polarization: str) -> str:
    """Name of a 2-D copy in /entry/plot."""
    return f"{quantity.name}_{polarization}"
