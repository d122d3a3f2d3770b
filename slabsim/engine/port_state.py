"""The state of the four-port recursion, and what an element does to it.

    state, from the back to the front:  b = G a (all that lies behind),  c = H a (amplitudes leaving at the back)
    a layer (R, T, R', T'):             G <- R + T' G (1 - R' G)^-1 T     H <- H (1 - R' G)^-1 T
    an end of wires:                    closes its port with the reflection coefficient rho of what it ends on
    a sheet of admittance Y:            G <- (1 + G)(1 + K)^-1 - 1        H <- H (1 + K)^-1     K = Y (1 + G)/2
    a set of wires in one plane:        Y = n n^T/z, of rank one
    a load in a joint:                  psi drops by z V, of rank one

G and H stand in their slots of the workspace, G n by n, H with a row for each amplitude that is followed.
"""

from slabsim.engine.half_spaces import kernel
from slabsim.engine.lanes import fill, load, store
from slabsim.engine.matrices import ELEMENT, add_to_diagonal, clear, copy, divide, multiply, one_minus_product
from slabsim.engine.port_rows import *
from slabsim.engine.slices import HEAD, R_BACK, T_BACK, G, H, R, T, U, V, W, X


@kernel
def value(table, row, at, by_angle):
    """Eight lanes of one row: one frequency in all of them, or eight frequencies."""
    if by_angle:
        return fill(table[row, at])
    return load(table[row], at)


@kernel
def fold(b, n, size, n_state, n_rows, mirror, element, recipe, at, by_angle):
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
            _close(b, n_left, size, n_rows, port, value(table, rho, at, by_angle), value(table, rho + 1, at, by_angle))
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
            store(b, g + ELEMENT * i * (n + 1), value(table, row, at, by_angle))
            store(b, g + ELEMENT * i * (n + 1) + 8, value(table, row + 1, at, by_angle))
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
def shunt(b, size, n_rows):
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
def series(b, n, size, n_rows, port, zr, zi):
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
def rescale(b, n, size, n_rows, gain, loss):
    """Another reference admittance: G <- (loss + gain G)(gain + loss G)^-1, H <- H (gain + loss G)^-1."""
    g, h, x, u = HEAD + G * size, HEAD + H * size, HEAD + X * size, HEAD + U * size
    for k in range(2 * n * n):
        part = load(b, g + 8 * k)
        store(b, x + 8 * k, loss * part)
        store(b, g + 8 * k, gain * part)
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
