"""A power spectrum at one angle, sampled finely enough to show every resonance.

A grid can step over a resonance narrower than its step, and the powers at the grid points would not show it. The
complex amplitude does: near a resonance it is a smooth background plus residue/(f - pole), and a rational function
through exact samples (the AAA algorithm) finds the pole even if all samples lie far outside the line. So:

    1. rational functions through overlapping windows of the grid give the poles close to the real axis;
       samples are set around each, spaced by its width;
    2. every interval whose midpoint differs from the straight line by more than a tolerance is halved, until none does.
"""

from __future__ import annotations

import warnings
from dataclasses import dataclass
from typing import Literal

import numpy as np

from slabsim.engine.response import Solver

Quantity = Literal["T", "R", "A"]
_WINDOW = 24  # samples per rational function; neighbours overlap by half
_AROUND = np.array([-30, -10, -4, -2, -1.2, -0.8, -0.4, 0, 0.4, 0.8, 1.2, 2, 4, 10, 30])  # in half widths
_STRAIGHT = 5e-3  # largest distance of a midpoint from the straight line, of the spectrum's peak
_FINEST = 1e-13  # relative step below which nothing is halved
_MOST = 200_000  # samples at which halving ends: lossless local wires have endless resonances at their plasma edge
_OPAQUE = 1e-150  # amplitude below which there is nothing to see


@dataclass(frozen=True)
class Line:
    """One quantity of one stack at one angle, azimuth and channel, as a function of frequency alone.

    Parameters
    ----------
    solver : Solver
        With one incident polarization.
    angle_deg : float
        Angle of incidence [degrees].
    quantity : {"T", "R", "A"}
    azimuth_deg : float
        Of the plane of incidence [degrees].
    is_cross : bool
        What leaves in the other polarization, in place of the own one.
    """

    solver: Solver
    angle_deg: float
    quantity: Quantity
    azimuth_deg: float = 0.0
    is_cross: bool = False

    @property
    def noise(self) -> float:
        """Power below which the quantity is rounding: A is a difference of numbers near 1, T and R are squares."""
        if self.is_cross:  # exactly zero in many planes of incidence, but for rounding
            return 1e-25
        return 1e-11 if self.quantity == "A" else 1e-290

    def power(self, frequencies: np.ndarray) -> np.ndarray:
        """The quantity at `frequencies` [Hz], any shape and order."""
        return self._solve(frequencies, self.quantity)

    def amplitude(self, frequencies: np.ndarray) -> np.ndarray:
        """Complex t, or r before a perfect conductor, at `frequencies` [Hz]."""
        return self._solve(frequencies, "r" if self.solver.stack.back is None else "t")

    def _solve(self, frequencies: np.ndarray, name: str) -> np.ndarray:
        frequencies = np.asarray(frequencies, dtype=float)
        response = self.solver.solve(frequencies.ravel(), self.angle_deg, self.azimuth_deg)
        return getattr(response, name)[int(self.is_cross), :, 0].reshape(frequencies.shape)


def fine_spectrum(line: Line, frequencies: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
    """Spectrum sampled so that straight lines between the samples show every feature.

    Parameters
    ----------
    line : Line
    frequencies : float array, shape (n_freqs,)
        Ascending start grid [Hz]; its ends bound the result.

    Returns
    -------
    frequencies, power : float arrays, shape (n_samples,)
        Ascending; the start grid is among them. Points that cannot be solved are left out.
    """
    at_poles = _samples_at(hidden_poles(line, frequencies), frequencies)
    f = np.union1d(frequencies, at_poles)
    power = line.power(f)
    f, power = f[np.isfinite(power)], power[np.isfinite(power)]
    if f.size < 2:
        return f, power
    fresh = np.ones(f.size - 1, dtype=bool)  # intervals not looked at yet
    while np.any(fresh) and f.size < _MOST:
        where = np.flatnonzero(fresh & (np.diff(f) > _FINEST * f[1:]))
        middle = 0.5 * (f[where] + f[where + 1])
        value = line.power(middle)
        bent = abs(value - 0.5 * (power[where] + power[where + 1])) > _STRAIGHT * max(power.max(), line.noise)
        where, middle, value = where[bent], middle[bent], value[bent]
        f, power = np.insert(f, where + 1, middle), np.insert(power, where + 1, value)
        fresh = np.zeros(f.size - 1, dtype=bool)
        position = where + np.arange(where.size)
        fresh[position] = fresh[position + 1] = True
    return f, power


def hidden_poles(line: Line, frequencies: np.ndarray) -> np.ndarray:
    """Complex frequencies [Hz] of poles whose lines may be narrower than the step of the grid.

    Only poles nearer to the real axis than twice the step around them; real part inside the grid.
    """
    amplitude = line.amplitude(frequencies)
    good = np.isfinite(amplitude) & (abs(amplitude) > _OPAQUE)
    f, amplitude = frequencies[good], amplitude[good]
    found = [np.zeros(0, dtype=complex)]
    for start in range(0, max(f.size - _WINDOW // 2, 1), _WINDOW // 2):
        window = slice(start, start + _WINDOW)
        if f[window].size >= 5:
            found.append(_poles(f[window], amplitude[window]))
    return np.concatenate(found)


def _poles(f: np.ndarray, amplitude: np.ndarray) -> np.ndarray:
    from scipy.interpolate import AAA

    middle, half = 0.5 * (f[0] + f[-1]), 0.5 * (f[-1] - f[0])
    with warnings.catch_warnings():
        warnings.simplefilter("ignore", RuntimeWarning)  # noise-level samples: no convergence, nothing to find
        poles = AAA((f - middle) / half, amplitude / abs(amplitude).max(), rtol=1e-12, max_terms=f.size // 2).poles()
    poles = middle + half * poles
    poles = poles[(poles.real > f[0]) & (poles.real < f[-1])]
    step = np.diff(f)[np.clip(np.searchsorted(f, poles.real) - 1, 0, f.size - 2)]
    return poles[abs(poles.imag) < 2.0 * step]


def _samples_at(poles: np.ndarray, frequencies: np.ndarray) -> np.ndarray:
    width = np.maximum(abs(poles.imag), _FINEST * poles.real)
    samples = (poles.real[:, None] + width[:, None] * _AROUND).ravel()
    return samples[(samples > frequencies[0]) & (samples < frequencies[-1])]
