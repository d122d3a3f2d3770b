"""Scattering matrices of a layer by doubling a thin slice.

The tangential fields and the wires' potentials v = (Ex, Ey, psi...) and currents i = (hy, -hx, V...) of a layer obey

    dv/dz = i k0 (D v + A i)        di/dz = i k0 (B v + D^T i)

Waves a = (v + i)/2 and b = (v - i)/2 with real reference admittance turn every passive layer into a scattering matrix

    b_front = R a_front + T' b_back        a_back = T a_front + R' b_back

of norm at most one. A slice is so thin that a short power series gives R and T to the last digit; putting two slices
together, and again two of those, needs no eigenvalues, no order of modes, and divides by 1 - R' R only.

    mirror symmetric (D = 0): the slice has even and odd parts, with g half its thickness,
        Y_even = -i g B P,  Z_odd = -i g P A,  P = tanc(g^2 A B) = 1 + g^2 AB/3 + 2 (g^2 AB)^2/15 + ...
        R = (1 + Y_even)^-1 - (1 + Z_odd)^-1,  T = (1 + Y_even)^-1 + (1 + Z_odd)^-1 - 1,  R' = R, T' = T
    else: exp(i h [[D, A], [B, D^T]]) by its Taylor series, turned into waves

Each lane doubles as often as its own layer needs.
"""

import math

from slabsim.engine.half_spaces import kernel
from slabsim.engine.lanes import fill, fma, load, store, where_positive
from slabsim.engine.matrices import ELEMENT, add_to_diagonal, clear, copy, divide, multiply, one_minus_product
from slabsim.engine.rows import LANES

# Slots: matrices of the workspace, each with `size` floats. A, B, D generate a layer; R ... T_BACK scatter; G, H are
# the state (`ports.py`); the others are for intermediate results.
A, B, D, R, T, R_BACK, T_BACK, X, X2, X3, P, U, V, W, Z, G, H, N_SLOTS = range(18)
# Rows of eight floats in front of the slots: s, q^2, k0 d, thickness of a slice, first doubling of a lane
AT_S, AT_Q2, AT_DEPTH, AT_SCALE, AT_LATE = 0, 8, 16, 24, 32
AT_MEDIA = 40  # from here on `ports.py` keeps the half-spaces and the resonances
HEAD = 640  # here the slots begin
_SERIES = (  # tan(x)/x in powers of x^2
    1.0,
    1.0 / 3.0,
    2.0 / 15.0,
    17.0 / 315.0,
    62.0 / 2835.0,
    1382.0 / 155925.0,
    21844.0 / 6081075.0,
    929569.0 / 638512875.0,
    6404582.0 / 10854718875.0,
    443861162.0 / 1856156927625.0,
    18888466084.0 / 194896477400625.0,
    113927491862.0 / 2900518163668125.0,
)
_HALF = 0.31  # g sqrt(|AB|) up to which eleven powers reach the last digit
_WHOLE = 0.5  # h |M| up to which fifteen powers do
_MOST = 60.0  # doublings; a generator beyond that has no finite solution


@kernel
def slice_mirror(b, n, size):
    """R and T of a mirror-symmetric layer from the slots A and B and the row AT_DEPTH."""
    a, bb, x, x2, x3 = HEAD + A * size, HEAD + B * size, HEAD + X * size, HEAD + X2 * size, HEAD + X3 * size
    p, u, w, z = HEAD + P * size, HEAD + U * size, HEAD + W * size, HEAD + Z * size
    r, t = HEAD + R * size, HEAD + T * size
    multiply(b, n, n, n, a, bb, x, False)
    doublings = _choose(b, n, x, 0.5, 0.5 / _HALF)
    _scale_all(b, n * n, x, 2)
    multiply(b, n, n, n, x, x, x2, False)
    multiply(b, n, n, n, x2, x, x3, False)
    _polynomial(b, n, x, x2, p, 9)
    for first in (6, 3, 0):
        _polynomial(b, n, x, x2, w, first)
        multiply(b, n, n, n, x3, p, w, True)
        copy(b, n * n, w, p)
    multiply(b, n, n, n, bb, p, u, False)
    multiply(b, n, n, n, p, a, z, False)
    for at in (u, z):  # times -i g, plus 1
        for k in range(n * n):
            g, e = load(b, AT_SCALE), at + ELEMENT * k
            re, im = load(b, e), load(b, e + 8)
            store(b, e, g * im)
            store(b, e + 8, fill(0.0) - g * re)
        add_to_diagonal(b, n, at, 1.0)
    clear(b, r, n * n)
    add_to_diagonal(b, n, r, 1.0)
    copy(b, n * n, r, t)
    divide(b, n, n, u, r)
    divide(b, n, n, z, t)
    for k in range(2 * n * n):
        even, odd = load(b, r + 8 * k), load(b, t + 8 * k)
        store(b, r + 8 * k, even - odd)
        store(b, t + 8 * k, even + odd)
    add_to_diagonal(b, n, t, -1.0)
    for step in range(doublings):
        _double_mirror(b, n, size, step)


@kernel
def _double_mirror(b, n, size, step):
    r, t, w, u, v, z = (
        HEAD + R * size,
        HEAD + T * size,
        HEAD + W * size,
        HEAD + U * size,
        HEAD + V * size,
        HEAD + Z * size,
    )
    one_minus_product(b, n, r, r, w)
    copy(b, n * n, t, u)
    divide(b, n, n, w, u)  # u = (1 - R R)^-1 T
    multiply(b, n, n, n, r, u, v, False)
    copy(b, n * n, r, z)
    multiply(b, n, n, n, t, v, z, True)
    multiply(b, n, n, n, t, u, v, False)
    _take(b, n * n, step, z, r)
    _take(b, n * n, step, v, t)


@kernel
def slice_tilted(b, n, size):
    """R, T, R_BACK, T_BACK of a layer without mirror symmetry, from A, B, D; D^T stands for the fourth block."""
    m, x2, x3 = HEAD + X * size, HEAD + X2 * size, HEAD + X3 * size
    x4, p, w = HEAD + P * size, HEAD + U * size, HEAD + W * size
    _assemble(b, n, size, m)
    doublings = _choose(b, 2 * n, m, 1.0, 1.0 / _WHOLE)
    _scale_all(b, 4 * n * n, m, 1)
    for k in range(4 * n * n):  # times i
        e = m + ELEMENT * k
        re = load(b, e)
        store(b, e, fill(0.0) - load(b, e + 8))
        store(b, e + 8, re)
    n2 = 2 * n
    multiply(b, n2, n2, n2, m, m, x2, False)
    multiply(b, n2, n2, n2, x2, m, x3, False)
    multiply(b, n2, n2, n2, x2, x2, x4, False)
    _taylor(b, n2, m, x2, x3, p, 12)
    for first in (8, 4, 0):
        _taylor(b, n2, m, x2, x3, w, first)
        multiply(b, n2, n2, n2, x4, p, w, True)
        copy(b, n2 * n2, w, p)
    _to_waves(b, n, size, p)
    for step in range(doublings):
        _double(b, n, size, step)


@kernel
def _assemble(b, n, size, m):
    """[[D, A], [B, D^T]] as one matrix."""
    for i in range(n):
        for j in range(n):
            for part in (0, 8):
                at = ELEMENT * (i * n + j) + part
                store(b, m + ELEMENT * (i * 2 * n + j) + part, load(b, HEAD + D * size + at))
                store(b, m + ELEMENT * (i * 2 * n + n + j) + part, load(b, HEAD + A * size + at))
                store(b, m + ELEMENT * ((n + i) * 2 * n + j) + part, load(b, HEAD + B * size + at))
                store(b, m + ELEMENT * ((n + j) * 2 * n + n + i) + part, load(b, HEAD + D * size + at))


@kernel
def _to_waves(b, n, size, f):
    """R, T, R_BACK, T_BACK of a slice whose fields behind are f times those in front."""
    r, t, rb, tb = HEAD + R * size, HEAD + T * size, HEAD + R_BACK * size, HEAD + T_BACK * size
    w, ab = HEAD + W * size, HEAD + V * size
    for i in range(n):
        for j in range(n):
            for part in (0, 8):
                at = ELEMENT * (i * n + j) + part
                vv, vi = (
                    load(b, f + ELEMENT * (i * 2 * n + j) + part),
                    load(b, f + ELEMENT * (i * 2 * n + n + j) + part),
                )
                iv, ii = (
                    load(b, f + ELEMENT * ((n + i) * 2 * n + j) + part),
                    load(b, f + ELEMENT * ((n + i) * 2 * n + n + j) + part),
                )
                half = fill(0.5)
                store(b, t + at, half * (vv + ii + (vi + iv)))  # W_aa
                store(b, ab + at, half * (vv - ii - (vi - iv)))
                store(b, r + at, half * ((ii - vv) + (iv - vi)))  # -W_ba
                store(b, w + at, half * (vv + ii - (vi + iv)))  # W_bb
    clear(b, tb, n * n)
    add_to_diagonal(b, n, tb, 1.0)
    copy(b, n * n, w, HEAD + Z * size)
    divide(b, n, n, HEAD + Z * size, tb)
    divide(b, n, n, w, r)
    multiply(b, n, n, n, ab, r, t, True)
    multiply(b, n, n, n, ab, tb, rb, False)


@kernel
def _double(b, n, size, step):
    r, t, rb, tb = HEAD + R * size, HEAD + T * size, HEAD + R_BACK * size, HEAD + T_BACK * size
    w, u, v, x, y = HEAD + W * size, HEAD + U * size, HEAD + V * size, HEAD + X * size, HEAD + X2 * size
    nn = n * n
    one_minus_product(b, n, rb, r, w)
    copy(b, nn, t, u)
    divide(b, n, n, w, u)  # (1 - R' R)^-1 T
    one_minus_product(b, n, r, rb, w)
    copy(b, nn, tb, v)
    divide(b, n, n, w, v)  # (1 - R R')^-1 T'
    multiply(b, n, n, n, r, u, w, False)
    copy(b, nn, r, x)
    multiply(b, n, n, n, tb, w, x, True)
    multiply(b, n, n, n, rb, v, w, False)
    copy(b, nn, rb, y)
    multiply(b, n, n, n, t, w, y, True)
    _take(b, nn, step, x, r)
    _take(b, nn, step, y, rb)
    multiply(b, n, n, n, t, u, x, False)
    multiply(b, n, n, n, tb, v, y, False)
    _take(b, nn, step, x, t)
    _take(b, nn, step, y, tb)


@kernel
def _choose(b, n, x, power, factor):
    """Doublings that the lanes need, from the norm of x; into rows a slice's g or h, and a lane's first doubling.

    `power` 0.5: x is the square of what counts, and g is half a slice.
    """
    most = 0.0
    for lane in range(LANES):
        norm = 0.0
        for i in range(n):
            row = 0.0
            for j in range(n):
                at = x + ELEMENT * (i * n + j) + lane
                row += abs(b[at]) + abs(b[at + 8])
            norm = max(norm, row)
        depth = b[AT_DEPTH + lane]
        size = depth * factor * (math.sqrt(norm) if power == 0.5 else norm)
        needed = 0.0
        if size > 1.0:
            needed = math.ceil(math.log2(size)) if size < 1e18 else _MOST
        b[AT_LATE + lane] = needed
        b[AT_SCALE + lane] = power * depth * math.pow(2.0, -needed)
        most = max(most, needed)
    for lane in range(LANES):
        b[AT_LATE + lane] = most - b[AT_LATE + lane]
    return int(most)


@kernel
def _take(b, size, step, fresh, out):
    """`fresh` to `out`, in the lanes whose doubling has begun."""
    begun = fill(step + 0.5) - load(b, AT_LATE)
    for k in range(2 * size):
        store(b, out + 8 * k, where_positive(begun, load(b, fresh + 8 * k), load(b, out + 8 * k)))


@kernel
def _scale_all(b, size, x, power):
    scale = load(b, AT_SCALE)
    if power == 2:
        scale = scale * scale
    for k in range(2 * size):
        store(b, x + 8 * k, load(b, x + 8 * k) * scale)


@kernel
def _polynomial(b, n, x, x2, out, first):
    """c_first + c_first+1 x + c_first+2 x^2 of the series of tan."""
    c0, c1, c2 = _SERIES[first], _SERIES[first + 1], _SERIES[first + 2]
    for k in range(2 * n * n):
        store(b, out + 8 * k, fma(fill(c2), load(b, x2 + 8 * k), fill(c1) * load(b, x + 8 * k)))
    add_to_diagonal(b, n, out, c0)


@kernel
def _taylor(b, n, x, x2, x3, out, first):
    """Four terms of the series of exp, from 1/first! on."""
    c0 = 1.0
    for k in range(2, first + 1):
        c0 /= k
    c1 = c0 / (first + 1)
    c2 = c1 / (first + 2)
    c3 = c2 / (first + 3)
    for k in range(2 * n * n):
        high = fma(fill(c3), load(b, x3 + 8 * k), fill(c2) * load(b, x2 + 8 * k))
        store(b, out + 8 * k, fma(fill(c1), load(b, x + 8 * k), high))
    add_to_diagonal(b, n, out, c0)
