"""The four-port engine: stacks whose polarizations mix, or whose layers the scalar kernels do not know.

Fields are taken along the plane of incidence (p) and across it (s): v = (Ep, Es, psi...), i = (hs, -hp, V...), with one
pair (psi, V) for every set of wires that ends at the faces: phi = i psi/kp, n_z w = i kp V. Waves a = (v + i)/2,
b = (v - i)/2; a reference admittance y scales v by sqrt(y) and i by 1/sqrt(y), the same for all ports of an element.

    state, from the back to the front:  b = G a (all that lies behind),  c = H a (amplitudes leaving at the back)
    a layer (R, T, R', T'):             G <- R + T' G (1 - R' G)^-1 T     H <- H (1 - R' G)^-1 T
    an end of wires:                    closes its port with the reflection coefficient rho of what it ends on
    a sheet of admittance Y:            G <- (1 + G)(1 + K)^-1 - 1        H <- H (1 + K)^-1     K = Y (1 + G)/2
    a set of wires in one plane:        Y = n n^T/z, of rank one
    a load in a joint:                  psi drops by z V, of rank one

Ends are closed inside the layer, or at the end of a run of joined wires, so that the cascade sees two ports only.
Nothing grows, and all that is inverted has a Hermitian part that is not negative, as long as the media are passive.
"""

import math

import numpy as np
from numba import njit

from slabsim.engine.half_spaces import kernel, outgoing
from slabsim.engine.lanes import fill, fma, load, store
from slabsim.engine.matrices import ELEMENT, add_to_diagonal, clear, copy, divide, multiply, one_minus_product
from slabsim.engine.port_rows import *
from slabsim.engine.rows import LANES, PATCHES, STRIPS
from slabsim.engine.slices import (
    AT_DEPTH,
    AT_MEDIA,
    AT_Q2,
    AT_S,
    HEAD,
    N_SLOTS,
    R_BACK,
    T_BACK,
    A,
    B,
    D,
    G,
    H,
    R,
    T,
    U,
    V,
    W,
    X,
    slice_mirror,
    slice_tilted,
)
from slabsim.engine.vector_math import decay, inverse, root, sincos, wave

AT_POINT = AT_MEDIA  # eight rows of a point table
AT_WAVES = AT_MEDIA + 64  # rows of one mode of a diagonal layer
AT_INVERSES = AT_MEDIA + 256  # 1/(c0 + c1 q^2) of the sets parallel to the faces
assert AT_INVERSES + ELEMENT * MOST_SETS <= HEAD


@kernel
def _value(table, row, at, by_angle):
    """Eight lanes of one row: one frequency in all of them, or eight frequencies."""
    if by_angle:
        return fill(table[row, at])
    return load(table[row], at)


@kernel
def _generator(b, size, n, element, terms, table, at, by_angle):
    """The blocks A, B and D of a layer."""
    row = element[ROW]
    store(b, AT_DEPTH, _value(table, row + DEPTH, at, by_angle))
    for k in range(element[N_RESONANCES]):
        first = row + element[FIRST_RESONANCE] + 4 * k
        q2 = load(b, AT_Q2)
        re = fma(_value(table, first + 2, at, by_angle), q2, _value(table, first, at, by_angle))
        im = fma(_value(table, first + 3, at, by_angle), q2, _value(table, first + 1, at, by_angle))
        scale = fill(1.0) / fma(re, re, im * im)
        store(b, AT_INVERSES + ELEMENT * k, re * scale)
        store(b, AT_INVERSES + ELEMENT * k + 8, fill(0.0) - im * scale)
    for block in (A, B, D):
        clear(b, HEAD + block * size, n * n)
    for k in range(element[FIRST_TERM], element[FIRST_TERM] + element[N_TERMS]):
        block, entry, multiplier = terms[k, BLOCK], terms[k, ENTRY], terms[k, MULTIPLIER]
        target = HEAD + block * size + ELEMENT * entry
        re = _value(table, row + terms[k, COEFFICIENT], at, by_angle)
        im = _value(table, row + terms[k, COEFFICIENT] + 1, at, by_angle)
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
def _fold(b, n, size, n_state, n_rows, mirror, element, recipe, at, by_angle):
    """Put a layer of n ports (slots R, T, R_BACK, T_BACK) in front of the state; returns the ports of the new state."""
    _, _, ends, table, _, _ = recipe
    r, t = HEAD + R * size, HEAD + T * size
    rb, tb = (r, t) if mirror else (HEAD + R_BACK * size, HEAD + T_BACK * size)
    g, h, x, u = HEAD + G * size, HEAD + H * size, HEAD + X * size, HEAD + U * size
    if n > 2 or n_state > 2:
        _widen(b, n, size, n_state, n_rows, element, ends, table, at, by_angle)
    one_minus_product(b, n, rb, g, x)
    copy(b, n * n, t, u)
    divide(b, n, n, x, u)  # (1 - R' G)^-1 T
    multiply(b, n_rows, n, n, h, u, x, False)
    copy(b, n_rows * n, x, h)
    multiply(b, n, n, n, g, u, x, False)
    copy(b, n * n, r, g)
    multiply(b, n, n, n, tb, x, g, True)
    n_left = n
    for port in range(n - 1, 1, -1):
        end = element[FIRST_END] + port - 2
        if ends[end, KEPT] == 0:
            rho = element[ROW] + ends[end, RHO_FRONT]
            _close(
                b, n_left, size, n_rows, port, _value(table, rho, at, by_angle), _value(table, rho + 1, at, by_angle)
            )
            n_left -= 1
    return n_left


@kernel
def _widen(b, n, size, n_state, n_rows, element, ends, table, at, by_angle):
    """From the ports of the state to those of the layer: joined ones go on, the others end."""
    g, h, x, u = HEAD + G * size, HEAD + H * size, HEAD + X * size, HEAD + U * size
    copy(b, n_state * n_state, g, x)
    copy(b, n_rows * n_state, h, u)
    clear(b, g, n * n)
    clear(b, h, n_rows * n)
    for i in range(n):
        state_i = i if i < 2 else ends[element[FIRST_END] + i - 2, BEHIND]
        if state_i == OWN:
            row = element[ROW] + ends[element[FIRST_END] + i - 2, RHO_BACK]
            store(b, g + ELEMENT * i * (n + 1), _value(table, row, at, by_angle))
            store(b, g + ELEMENT * i * (n + 1) + 8, _value(table, row + 1, at, by_angle))
            continue
        for j in range(n):
            state_j = j if j < 2 else ends[element[FIRST_END] + j - 2, BEHIND]
            if state_j != OWN:
                copy(b, 1, x + ELEMENT * (state_i * n_state + state_j), g + ELEMENT * (i * n + j))
        for k in range(n_rows):
            copy(b, 1, u + ELEMENT * (k * n_state + state_i), h + ELEMENT * (k * n + i))


@kernel
def _close(b, n, size, n_rows, port, rho_re, rho_im):
    """End the wires of one port in front, where a = rho b: its column and row are folded into the others."""
    g, h, x, u, w = HEAD + G * size, HEAD + H * size, HEAD + X * size, HEAD + U * size, HEAD + W * size
    own = g + ELEMENT * port * (n + 1)
    gr, gi = load(b, own), load(b, own + 8)
    store(b, x, fill(1.0) - (rho_re * gr - rho_im * gi))
    store(b, x + 8, fill(0.0) - (rho_re * gi + rho_im * gr))
    store(b, u, rho_re)
    store(b, u + 8, rho_im)
    divide(b, 1, 1, x, u)  # rho/(1 - rho G_jj)
    copy(b, n, g + ELEMENT * port * n, w)
    multiply(b, 1, 1, n, u, w, x, False)  # a of the port, from a of the others
    _fold_column(b, n, n, port, x, g, w)
    _fold_column(b, n_rows, n, port, x, h, w)
    _drop_row(b, n - 1, port, g)


@kernel
def _fold_column(b, n_rows, n, port, row, out, column):
    """out <- out + (column `port` of out) row, without that column."""
    for i in range(n_rows):
        copy(b, 1, out + ELEMENT * (i * n + port), column + ELEMENT * i)
    multiply(b, n_rows, 1, n, column, row, out, True)
    target = 0
    for k in range(n_rows * n):
        if k % n != port:
            copy(b, 1, out + ELEMENT * k, out + ELEMENT * target)
            target += 1


@kernel
def _drop_row(b, n, port, x):
    for k in range(port * n, n * n):
        copy(b, 1, x + ELEMENT * (k + n), x + ELEMENT * k)


@kernel
def _shunt(b, size, n_rows):
    """A sheet whose admittance stands in slot U, halved: K = Y (1 + G)/2, then (1 + G)(1 + K)^-1 - 1."""
    g, h, x, u, v = HEAD + G * size, HEAD + H * size, HEAD + X * size, HEAD + U * size, HEAD + V * size
    add_to_diagonal(b, 2, g, 1.0)
    multiply(b, 2, 2, 2, u, g, x, False)
    add_to_diagonal(b, 2, x, 1.0)
    clear(b, v, 4)
    add_to_diagonal(b, 2, v, 1.0)
    divide(b, 2, 2, x, v)
    multiply(b, 2, 2, 2, g, v, x, False)
    add_to_diagonal(b, 2, x, -1.0)
    copy(b, 4, x, g)
    multiply(b, n_rows, 2, 2, h, v, x, False)
    copy(b, 2 * n_rows, x, h)


@kernel
def _sheet(b, size, element, table, at, by_angle):
    """Half the admittance of a sheet into slot U."""
    u, row = HEAD + U * size, element[ROW]
    re, im = _value(table, row + Y_SHEET, at, by_angle), _value(table, row + Y_SHEET + 1, at, by_angle)
    tr, ti = _value(table, row + TILT, at, by_angle), _value(table, row + TILT + 1, at, by_angle)
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
        weight = _value(table, row + DIRECTION + (k + 1) // 2, at, by_angle)
        store(b, u + ELEMENT * k, weight * yr)
        store(b, u + ELEMENT * k + 8, weight * yi)


@kernel
def _series(b, n, size, n_rows, port, zr, zi):
    """A load in the joint of one port; zr + i zi is half its impedance. M = 1 - G, f = z/(1 + z M_jj):
    G <- G + f M_j M_j^T, H <- H - f H_j M_j^T, and H_j (1 - f M_jj) = H_j/(1 + z M_jj)."""
    g, h, x = HEAD + G * size, HEAD + H * size, HEAD + X * size
    u, v, w = HEAD + U * size, HEAD + V * size, HEAD + W * size
    own = g + ELEMENT * port * (n + 1)
    mr, mi = fill(1.0) - load(b, own), fill(0.0) - load(b, own + 8)
    store(b, x, fill(1.0) + (zr * mr - zi * mi))
    store(b, x + 8, zr * mi + zi * mr)
    store(b, u, zr)
    store(b, u + 8, zi)
    store(b, u + ELEMENT, fill(1.0))
    store(b, u + ELEMENT + 8, fill(0.0))
    divide(b, 1, 2, x, u)  # f, and 1/(1 + z M_jj)
    for j in range(n):  # row and column of M
        for part in (0, 8):
            one = fill(1.0) if j == port and part == 0 else fill(0.0)
            store(b, v + ELEMENT * j + part, one - load(b, g + ELEMENT * (port * n + j) + part))
            store(b, w + ELEMENT * j + part, one - load(b, g + ELEMENT * (j * n + port) + part))
    multiply(b, 1, 1, n, u, v, x, False)
    multiply(b, n, 1, n, w, x, g, True)
    for i in range(n_rows):
        copy(b, 1, h + ELEMENT * (i * n + port), w)
        multiply(b, 1, 1, 1, w, u + ELEMENT, v, False)
        for part in (0, 8):
            store(b, w + part, fill(0.0) - load(b, w + part))
        multiply(b, 1, 1, n, w, x, h + ELEMENT * i * n, True)
        copy(b, 1, v, h + ELEMENT * (i * n + port))


@kernel
def _rescale(b, n, size, n_rows, gain, loss):
    """Another reference admittance: G <- (loss + gain G)(gain + loss G)^-1, H <- H (gain + loss G)^-1."""
    g, h, x, u = HEAD + G * size, HEAD + H * size, HEAD + X * size, HEAD + U * size
    for k in range(2 * n * n):
        value = load(b, g + 8 * k)
        store(b, x + 8 * k, loss * value)
        store(b, g + 8 * k, gain * value)
    for i in range(n):
        at = ELEMENT * i * (n + 1)
        store(b, x + at, load(b, x + at) + gain)
        store(b, g + at, load(b, g + at) + loss)
    clear(b, u, n * n)
    add_to_diagonal(b, n, u, 1.0)
    divide(b, n, n, x, u)
    multiply(b, n, n, n, g, u, x, False)
    copy(b, n * n, x, g)
    multiply(b, n_rows, n, n, h, u, x, False)
    copy(b, n_rows * n, x, h)


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
        _shunt(b, size, n_rows)
    elif kind == GRID:
        _gather(b, element, points, at, first, by_angle, 2)
        _grid(b, size, element, table, at, by_angle)
        _shunt(b, size, n_rows)
    elif kind == SERIES:
        row = element[ROW] + LOAD
        zr, zi = _value(table, row, at, by_angle), _value(table, row + 1, at, by_angle)
        _series(b, n_state, size, n_rows, element[PORT], zr, zi)
    elif kind == RESCALE:
        gain = _value(table, element[ROW] + GAIN, at, by_angle)
        _rescale(b, n_state, size, n_rows, gain, _value(table, element[ROW] + LOSS, at, by_angle))
    elif kind == PLATES:
        _gather(b, element, points, at, first, by_angle, 8)
        _plates(b, size)
        return _fold(b, 2, size, n_state, n_rows, True, element, recipe, at, by_angle)
    else:
        _generator(b, size, n, element, terms, table, at, by_angle)
        if kind == DIAGONAL:
            _diagonal(b, size)
        elif kind == MIRROR:
            slice_mirror(b, n, size)
        else:
            slice_tilted(b, n, size)
        return _fold(b, n, size, n_state, n_rows, kind != TILTED, element, recipe, at, by_angle)
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
