"""The four-port engine: stacks whose polarizations mix, or whose layers the scalar kernels do not know.

Fields are taken along the plane of incidence (p) and across it (s): v = (Ep, Es, psi...), i = (hs, -hp, V...), with one
pair (psi, V) for every set of wires that ends at the faces: phi = i psi/kp, n_z w = i kp V. Waves a = (v + i)/2,
b = (v - i)/2; a reference admittance y scales v by sqrt(y) and i by 1/sqrt(y), the same for all ports of an element.

The state G, H and the steps that change it stand in `port_state.py`; scattering matrices of layers in `slices.py`.

Ends are closed inside the layer, or at the end of a run of joined wires, so that the cascade sees two ports only.
Nothing grows, and all that is inverted has a Hermitian part that is not negative, as long as the media are passive.
"""

import math

import numpy as np
from numba import njit

from slabsim.engine.half_spaces import kernel, outgoing
from slabsim.engine.lanes import fill, fma, load, store
from slabsim.engine.matrices import ELEMENT, clear, copy
from slabsim.engine.port_rows import *
from slabsim.engine.port_state import fold, rescale, series, shunt, value
from slabsim.engine.rows import LANES, PATCHES, STRIPS
from slabsim.engine.slices import (
    AT_DEPTH,
    AT_MEDIA,
    AT_Q2,
    AT_S,
    HEAD,
    N_SLOTS,
    A,
    B,
    D,
    G,
    H,
    R,
    T,
    U,
    slice_mirror,
    slice_tilted,
)
from slabsim.engine.vector_math import decay, inverse, root, sincos, wave

AT_POINT = AT_MEDIA  # eight rows of a point table
AT_WAVES = AT_MEDIA + 64  # rows of one mode of a diagonal layer
AT_INVERSES = AT_MEDIA + 256  # 1/(c0 + c1 q^2) of the sets parallel to the faces
assert AT_INVERSES + ELEMENT * MOST_SETS <= HEAD


@kernel
def _generator(b, size, n, element, terms, table, at, by_angle):
    """The blocks A, B and D of a layer."""
    row = element[ROW]
    store(b, AT_DEPTH, value(table, row + DEPTH, at, by_angle))
    for k in range(element[N_RESONANCES]):
        first = row + element[FIRST_RESONANCE] + 4 * k
        q2 = load(b, AT_Q2)
        re = fma(value(table, first + 2, at, by_angle), q2, value(table, first, at, by_angle))
        im = fma(value(table, first + 3, at, by_angle), q2, value(table, first + 1, at, by_angle))
        scale = fill(1.0) / fma(re, re, im * im)
        store(b, AT_INVERSES + ELEMENT * k, re * scale)
        store(b, AT_INVERSES + ELEMENT * k + 8, fill(0.0) - im * scale)
    for block in (A, B, D):
        clear(b, HEAD + block * size, n * n)
    for k in range(element[FIRST_TERM], element[FIRST_TERM] + element[N_TERMS]):
        block, entry, multiplier = terms[k, BLOCK], terms[k, ENTRY], terms[k, MULTIPLIER]
        target = HEAD + block * size + ELEMENT * entry
        re = value(table, row + terms[k, COEFFICIENT], at, by_angle)
        im = value(table, row + terms[k, COEFFICIENT] + 1, at, by_angle)
        if multiplier >= RESONANCE:
            inv = AT_INVERSES + ELEMENT * (multiplier - RESONANCE)
            fr, fi = load(b, inv), load(b, inv + 8)
            re, im = re * fr - im * fi, fma(re, fi, im * fr)
        elif multiplier != ONE:
            factor = load(b, AT_S if multiplier == SINE else AT_Q2)
            re, im = re * factor, im * factor
        store(b, target, load(b, target) + re)
        store(b, target + 8, load(b, target + 8) + im)


@kernel
def _diagonal(b, size):
    """R and T of a layer whose blocks A and B are diagonal: each polarization has its own mode."""
    r, t = HEAD + R * size, HEAD + T * size
    clear(b, r, 4)
    clear(b, t, 4)
    for k in (0, 3):
        at_a, at_b = HEAD + A * size + ELEMENT * k, HEAD + B * size + ELEMENT * k
        copy(b, 1, at_a, AT_WAVES)
        copy(b, 1, at_b, AT_WAVES + ELEMENT)
        _mode(b)
        copy(b, 1, AT_WAVES + 2 * ELEMENT, r + ELEMENT * k)
        copy(b, 1, AT_WAVES + 3 * ELEMENT, t + ELEMENT * k)


@kernel
def _mode(b):
    """R, T of one mode of dv/dz = i k0 A i, di/dz = i k0 B v, whose A and B stand in the first two of its rows."""
    for i in range(LANES):
        a_value = complex(b[AT_WAVES + i], b[AT_WAVES + 8 + i])
        b_value = complex(b[AT_WAVES + 16 + i], b[AT_WAVES + 24 + i])
        kappa, inv_size = root(a_value * b_value)
        em1, e = decay(-kappa.imag * b[AT_DEPTH + i])
        sn, cs = sincos(kappa.real * b[AT_DEPTH + i])
        p, c, g = wave(kappa, inv_size, em1, e, sn, cs)
        half = 0.5 * g
        inv = inverse(c + (a_value + b_value) * half)
        r, t = (a_value - b_value) * half * inv, p * inv
        b[AT_WAVES + 32 + i], b[AT_WAVES + 40 + i] = r.real, r.imag
        b[AT_WAVES + 48 + i], b[AT_WAVES + 56 + i] = t.real, t.imag


@kernel
def _plates(b, size):
    """R and T of plates, from the point rows: R, T along the plane of incidence, R, T across it."""
    r, t = HEAD + R * size, HEAD + T * size
    clear(b, r, 4)
    clear(b, t, 4)
    for k in (0, 3):
        source = AT_POINT + (0 if k == 0 else 2 * ELEMENT)
        copy(b, 1, source, r + ELEMENT * k)
        copy(b, 1, source + ELEMENT, t + ELEMENT * k)


@kernel
def _sheet(b, size, element, table, at, by_angle):
    """Half the admittance of a sheet into slot U."""
    u, row = HEAD + U * size, element[ROW]
    re, im = value(table, row + Y_SHEET, at, by_angle), value(table, row + Y_SHEET + 1, at, by_angle)
    tr, ti = value(table, row + TILT, at, by_angle), value(table, row + TILT + 1, at, by_angle)
    s2 = load(b, AT_S) * load(b, AT_S)
    form = table[row + FORM, at]
    clear(b, u, 4)
    half = fill(0.5)
    store(b, u, half * re)
    store(b, u + 8, half * im)
    copy(b, 1, u, u + 3 * ELEMENT)
    if form in (PATCHES, STRIPS):
        oblique = u if form == STRIPS else u + 3 * ELEMENT
        fr, fi = fill(1.0) - s2 * tr, fill(0.0) - s2 * ti
        if form == STRIPS:
            scale = fill(1.0) / fma(fr, fr, fi * fi)
            fr, fi = fr * scale, fill(0.0) - fi * scale
        re, im = load(b, oblique), load(b, oblique + 8)
        store(b, oblique, re * fr - im * fi)
        store(b, oblique + 8, fma(re, fi, im * fr))


@kernel
def _grid(b, size, element, table, at, by_angle):
    """Half of n n^T/z of a plane of wires into slot U; z stands in the point rows."""
    u, row = HEAD + U * size, element[ROW]
    zr, zi = load(b, AT_POINT), load(b, AT_POINT + 8)
    scale = fill(1.0) / fma(zr, zr, zi * zi)
    yr, yi = zr * scale, fill(0.0) - zi * scale
    for k in range(4):
        weight = value(table, row + DIRECTION + (k + 1) // 2, at, by_angle)
        store(b, u + ELEMENT * k, weight * yr)
        store(b, u + ELEMENT * k + 8, weight * yi)


@kernel
def _gather(b, element, points, at, first, by_angle, n_rows):
    """Rows of the point table at the eight points."""
    row = element[POINT_ROW]
    for k in range(n_rows):
        for i in range(LANES):
            if by_angle:
                b[AT_POINT + 8 * k + i] = points[row + k, at, min(first + i, points.shape[2] - 1)]
            else:
                b[AT_POINT + 8 * k + i] = points[row + k, min(at + i, points.shape[1] - 1), first]


@kernel
def _element(b, size, n_state, n_rows, e, recipe, at, first, by_angle):
    """One element of the recipe; returns the ports of the new state."""
    elements, terms, _, table, points, _ = recipe
    element = elements[e]
    kind, n = element[KIND], element[N_PORTS]
    if kind == SHEET:
        _sheet(b, size, element, table, at, by_angle)
        shunt(b, size, n_rows)
    elif kind == GRID:
        _gather(b, element, points, at, first, by_angle, 2)
        _grid(b, size, element, table, at, by_angle)
        shunt(b, size, n_rows)
    elif kind == SERIES:
        row = element[ROW] + LOAD
        zr, zi = value(table, row, at, by_angle), value(table, row + 1, at, by_angle)
        series(b, n_state, size, n_rows, element[PORT], zr, zi)
    elif kind == RESCALE:
        gain = value(table, element[ROW] + GAIN, at, by_angle)
        rescale(b, n_state, size, n_rows, gain, value(table, element[ROW] + LOSS, at, by_angle))
    elif kind == PLATES:
        _gather(b, element, points, at, first, by_angle, 8)
        _plates(b, size)
        return fold(b, 2, size, n_state, n_rows, True, element, recipe, at, by_angle)
    else:
        _generator(b, size, n, element, terms, table, at, by_angle)
        if kind == DIAGONAL:
            _diagonal(b, size)
        elif kind == MIRROR:
            slice_mirror(b, n, size)
        else:
            slice_tilted(b, n, size)
        return fold(b, n, size, n_state, n_rows, kind != TILTED, element, recipe, at, by_angle)
    return n_state


@kernel
def _begin(b, size, media, at, by_angle, metal_back):
    """The state behind the last element; s and q^2 in its rows come as sine and squared cosine of the angle."""
    g, h = HEAD + G * size, HEAD + H * size
    clear(b, g, 4)
    clear(b, h, 4)
    for i in range(LANES):
        f = at if by_angle else min(at + i, media.shape[1] - 1)
        index2 = media[FRONT_EPS, f] * media[FRONT_MU, f]
        b[AT_S + i] *= math.sqrt(index2)
        b[AT_Q2 + i] *= index2
        eps, mu = complex(media[BACK_EPS, f], media[BACK_EPS + 1, f]), complex(media[BACK_MU, f], media[BACK_MU + 1, f])
        y = media[BACK_Y, f]
        k2 = eps * mu - index2 + b[AT_Q2 + i]
        one = complex(1.0, 0.0)
        z_p, y_s = outgoing(k2, inverse(eps)), outgoing(k2, inverse(mu))
        h_p, h_s = 2.0 * math.sqrt(y) * inverse(one + y * z_p), 2.0 * math.sqrt(y) * inverse(y + y_s)
        g_p, g_s = (y * z_p - one) * inverse(one + y * z_p), (y - y_s) * inverse(y + y_s)
        if metal_back:
            g_p, g_s, h_p, h_s = -one, -one, 0.0 * one, 0.0 * one
        b[g + i], b[g + 8 + i] = g_p.real, g_p.imag
        b[g + 48 + i], b[g + 56 + i] = g_s.real, g_s.imag
        b[h + i], b[h + 8 + i] = h_p.real, h_p.imag
        b[h + 48 + i], b[h + 56 + i] = h_s.real, h_s.imag


@njit(inline="always")
def _entry(b, x, k, i):
    return complex(b[x + ELEMENT * k + i], b[x + ELEMENT * k + 8 + i])


@kernel
def _incident(b, size, i, y, z_p, y_s, from_te):
    """Waves a at the front face, driven by a TE wave E.s = 1 or a TM wave h.s = 1, and v, i there."""
    g, x = HEAD + G * size, math.sqrt(y)
    gpp, gps, gsp, gss = _entry(b, g, 0, i), _entry(b, g, 1, i), _entry(b, g, 2, i), _entry(b, g, 3, i)
    one = complex(1.0, 0.0)
    # i_p + v_p/z_p and v_s + i_s/y_s are twice the incident wave; multiplied by z_p, y_s to stay finite at grazing
    pp, ps = (one + gpp) / x + z_p * x * (one - gpp), gps / x - z_p * x * gps
    sp, ss = y_s / x * gsp - x * gsp, y_s / x * (one + gss) + x * (one - gss)
    det = inverse(pp * ss - ps * sp)
    if from_te:
        return -2.0 * y_s * ps * det, 2.0 * y_s * pp * det
    return 2.0 * z_p * ss * det, -2.0 * z_p * sp * det


@kernel
def _finish(b, size, i, f, media, metal_back, from_te, out):
    """r, t into TE and into TM, R and T, of one point: `out` takes r_te, r_tm, t_te, t_tm and the powers alike."""
    g, h = HEAD + G * size, HEAD + H * size
    eps, mu, y = media[FRONT_EPS, f], media[FRONT_MU, f], media[FRONT_Y, f]
    q = math.sqrt(b[AT_Q2 + i])
    z_p, y_s = q / eps, q / mu
    a_p, a_s = _incident(b, size, i, y, z_p, y_s, from_te)
    x = math.sqrt(y)
    v_s = (a_s + _entry(b, g, 2, i) * a_p + _entry(b, g, 3, i) * a_s) / x
    i_p = (a_p - _entry(b, g, 0, i) * a_p - _entry(b, g, 1, i) * a_s) * x
    impedance = math.sqrt(eps / mu)  # h.s = impedance * a for a TM wave of amplitude a
    r_te = v_s - (1.0 if from_te else 0.0)
    r_tm = i_p - (0.0 if from_te else 1.0)
    t_te = _entry(b, h, 0 + 2, i) * a_p + _entry(b, h, 3, i) * a_s
    t_tm = _entry(b, h, 0, i) * a_p + _entry(b, h, 1, i) * a_s
    eps_b, mu_b = complex(media[BACK_EPS, f], media[BACK_EPS + 1, f]), complex(media[BACK_MU, f], media[BACK_MU + 1, f])
    k2 = eps_b * mu_b - eps * mu + b[AT_Q2 + i]
    flux_te, flux_tm = outgoing(k2, inverse(mu_b)).real, outgoing(k2, inverse(eps_b)).real
    flux_in = y_s if from_te else z_p
    out[4], out[5] = _square(r_te) * y_s / flux_in, _square(r_tm) * z_p / flux_in
    out[6], out[7] = _square(t_te) * flux_te / flux_in, _square(t_tm) * flux_tm / flux_in
    # from h.s to amplitudes of the electric field
    behind = np.sqrt(mu_b) / np.sqrt(eps_b)
    out[0], out[1], out[2], out[3] = r_te, r_tm / impedance, t_te, t_tm * behind
    if not from_te:
        out[0], out[1], out[2], out[3] = r_te * impedance, r_tm, t_te * impedance, out[3] * impedance


@njit(inline="always")
def _square(z):
    return z.real * z.real + z.imag * z.imag


@kernel
def _group(b, size, recipe, at, first, by_angle, metal_back, trace):
    """Eight points, from the back to the front. With room in `trace`, the workspace after each element goes there."""
    n_elements = recipe[0].shape[0]
    _begin(b, size, recipe[5], at, by_angle, metal_back)
    n_state = 2
    traced = trace.shape[0] > 0
    n_rows = 2
    for e in range(n_elements):
        if traced:  # rows of H that start as the identity: what reaches the far side of this element
            for k in range(b.size):
                trace[e, k] = b[k]
            n_rows = 2 + n_state
            h = HEAD + H * size
            clear(b, h + ELEMENT * 2 * n_state, n_state * n_state)
            for k in range(n_state):
                store(b, h + ELEMENT * ((2 + k) * n_state + k), fill(1.0))
        n_state = _element(b, size, n_state, n_rows, e, recipe, at, first, by_angle)
    if traced:
        for k in range(b.size):
            trace[n_elements, k] = b[k]


@njit(nogil=True, cache=True, error_model="numpy")
def solve_ports(recipe, sin2, cos2, metal_back, n_ports, amplitudes, powers):
    """Solve a grid of frequencies and angles at one azimuth.

    Parameters
    ----------
    recipe : tuple of arrays
        elements, terms, ends: int64, shapes (n_elements, N_COLUMNS), (n_terms, 4), (n_ends, 4); back to front, the
        columns are named in `port_rows`.
        table: float, shape (n_rows, n_freqs + LANES); the last column repeated, so that eight frequencies can be read
        from any of them on.
        points: float, shape (n_point_rows, n_freqs, n_angles).
        media: float, shape (N_MEDIA, n_freqs).
    sin2, cos2 : float arrays, shape (n_angles,)
        Squares of sine and cosine of the angle of incidence in the front medium.
    metal_back : bool
    n_ports : int
        Most ports of an element.
    amplitudes : complex array, shape (2, 2, 2, n_freqs, n_angles)
        Filled: r, t; incident TE, TM; leaving as TE, TM.
    powers : float array of the same shape
        Filled with R, T.
    """
    media = recipe[5]
    n_freqs, n_angles = media.shape[1], sin2.size
    size = ELEMENT * 4 * n_ports * n_ports
    b = np.zeros(HEAD + N_SLOTS * size)
    nothing = np.empty((0, 0))
    out = np.zeros(8, dtype=np.complex128)
    by_angle = n_angles >= min(n_freqs, LANES)
    outer, inner = (n_freqs, n_angles) if by_angle else (n_angles, n_freqs)
    for o in range(outer):
        for i0 in range(0, inner, LANES):
            for i in range(LANES):
                a = min(i0 + i, n_angles - 1) if by_angle else o
                b[AT_S + i], b[AT_Q2 + i] = math.sqrt(sin2[a]), cos2[a]
            at, first = (o, i0) if by_angle else (i0, o)
            _group(b, size, recipe, at, first, by_angle, metal_back, nothing)
            for i in range(min(LANES, inner - i0)):
                f, a = (o, i0 + i) if by_angle else (i0 + i, o)
                for p in range(2):
                    _finish(b, size, i, f, media, metal_back, p == 0, out)
                    for k in range(4):
                        amplitudes[k // 2, p, k % 2, f, a] = out[k]
                        powers[k // 2, p, k % 2, f, a] = out[4 + k].real


@njit(nogil=True, cache=True, error_model="numpy")
def trace_ports(recipe, sin2, cos2, metal_back, n_ports, states):
    """Workspace in front of and after every element, at one frequency and at most LANES angles.

    Arguments as in `solve_ports`, with n_freqs = 1; `states`: float array, shape (n_elements + 1, workspace).
    """
    size = ELEMENT * 4 * n_ports * n_ports
    b = np.zeros(HEAD + N_SLOTS * size)
    for i in range(LANES):
        a = min(i, sin2.size - 1)
        b[AT_S + i], b[AT_Q2 + i] = math.sqrt(sin2[a]), cos2[a]
    _group(b, size, recipe, 0, 0, True, metal_back, states)


def slot_size(n_ports: int) -> int:
    """Floats of one matrix in the workspace."""
    return ELEMENT * 4 * n_ports * n_ports


def workspace(n_ports: int) -> int:
    """Floats of the workspace."""
    return HEAD + N_SLOTS * slot_size(n_ports)
