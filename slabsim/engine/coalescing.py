"""Points where the two modes of a wire layer coalesce, or where the layer is thin.

There the divided differences of the modes (see `_modes` in `kernels.py`) lose their digits when they are taken as
differences. Such points are few; each is done again here, by formulas in which nothing cancels.
"""

import numpy as np
from numba import njit

from slabsim.engine.rows import (
    CC,
    DEPTH,
    FIRST,
    GAP,
    HW,
    K2,
    KK,
    MEAN,
    PI,
    SECOND,
    XC,
    XG,
    XW,
    YC,
    YG,
    YW,
    YWW,
    C,
    D,
    H,
    Y,
)
from slabsim.engine.vector_math import root


@njit(inline="always")
def get(w, row, i):
    return complex(w[row * C + i], w[(row + 1) * C + i])


@njit(inline="always")
def put(w, row, i, z):
    w[row * C + i] = z.real
    w[(row + 1) * C + i] = z.imag


@njit(nogil=True, error_model="numpy")
def _sinc(z):
    """sin(z)/z."""
    if abs(z) < 1e-4:
        return 1.0 - z * z / 6.0
    return np.sin(z) / z


@njit(nogil=True, error_model="numpy")
def rare_modes(w, i):
    """The divided differences where the modes coalesce or the layer is thin, without cancellation.

    With m, n = half sum and half difference of the two phases and phi1 phi2 = m^2 - n^2:

        Y  = -i PI d^3/2 (sinc 2m - sinc 2n)/(phi1 phi2)      KK = PI d^4/4 (sinc^2 m - sinc^2 n)/(phi1 phi2)
        YC = -PI d^2/2 sinc m sinc n                          YG = -i PI d^3/2 (cos m sinc n - sinc m cos n)/(phi1 phi2)

    For small phases the quotients are summed as series; else PI = exp(2 i m) is multiplied in, so that no
    exponential grows.
    """
    depth = w[DEPTH * C + i]
    mean, gap = get(w, MEAN, i), get(w, GAP, i)
    k1, _ = root(get(w, FIRST + K2, i))
    k2, _ = root(get(w, SECOND + K2, i))
    apart = k1.real * k2.real + k1.imag * k2.imag < 0.0
    if apart:
        k2 = -k2  # all is even in kappa: take the pair that lies together
    m = 0.5 * (k1 + k2) * depth
    n = 0.25 * gap * depth * depth / m  # (k1 - k2) depth/2 without cancellation
    if abs(n) > 0.5:
        return  # the phases differ enough: the plain differences keep their digits
    a, b, half = m + n, m - n, np.exp(1j * m)
    pi = half * half
    sinc_m = (pi - 1.0) / (2j * m) if abs(m) > 1e-4 else half * _sinc(m)  # times exp(i m)
    if abs(m) < 0.5:
        y, kk, yg = _quotient_series(m * m, n * n, a * a, b * b)
        y, kk, yg = pi * y, pi * kk, pi * yg
    else:
        y = ((pi * pi - 1.0) / (4j * m) - pi * _sinc(2.0 * n)) / (a * b)
        kk = (sinc_m * sinc_m - pi * _sinc(n) ** 2) / (a * b)
        yg = half * (0.5 * (pi + 1.0) * _sinc(n) - sinc_m * np.cos(n)) / (a * b)
    if apart:
        _naive_means(w, i, a, b, pi)
    y, kk, yg = -0.5j * depth**3 * y, 0.25 * depth**4 * kk, -0.5j * depth**3 * yg
    put(w, Y, i, y)
    put(w, KK, i, kk)
    put(w, YW, i, mean * y - get(w, H, i))
    put(w, YC, i, -0.5 * depth * depth * half * sinc_m * _sinc(n))
    put(w, YG, i, yg)
    put(w, YWW, i, mean * yg + get(w, XG, i))


@njit(nogil=True, error_model="numpy")
def _naive_means(w, i, a, b, pi):
    """The means for phases a, b close to the real axis, one of them with the other sign of kappa."""
    depth = w[DEPTH * C + i]
    l1, l2 = get(w, FIRST + K2, i), get(w, SECOND + K2, i)
    cos_a, cos_b, sinc_a, sinc_b = np.cos(a), np.cos(b), _sinc(a), _sinc(b)
    put(w, CC, i, pi * cos_a * cos_b)
    put(w, D, i, -pi * depth * depth * sinc_a * sinc_b)
    put(w, PI, i, pi)
    put(w, H, i, -0.5j * pi * depth * (cos_a * sinc_b + cos_b * sinc_a))
    put(w, HW, i, -0.5j * pi * depth * (cos_a * l2 * sinc_b + cos_b * l1 * sinc_a))
    put(w, XC, i, 0.5 * pi * (cos_a + cos_b))
    put(w, XG, i, -0.5j * pi * depth * (sinc_a + sinc_b))
    put(w, XW, i, -0.5j * pi * depth * (l1 * sinc_a + l2 * sinc_b))


@njit(nogil=True, error_model="numpy")
def _quotient_series(m2, n2, a2, b2):
    """Quotients of `rare_modes` for small phases; sums of the Taylor series of sinc 2x, sinc^2 x, sinc x."""
    y, kk, yg = 0.0j, 0.0j, 0.0j
    sums_mn, sums_ab = 1.0 + 0.0j, 1.0 + 0.0j  # (m^2k - n^2k)/(m^2 - n^2)
    power_n, power_b = n2, b2
    factorial = 6.0  # (2k + 1)!
    sign, four = -1.0, 4.0
    for k in range(1, 16):
        y += sign * four / factorial * sums_mn
        kk += sign * 2.0 * four / (factorial * (2 * k + 2)) * sums_mn
        yg += sign * 2.0 / factorial * sums_ab  # a^2 - b^2 = 4 m n: half of it is in the prefactor
        sums_mn = m2 * sums_mn + power_n
        sums_ab = a2 * sums_ab + power_b
        power_n, power_b = power_n * n2, power_b * b2
        factorial *= (2 * k + 2) * (2 * k + 3)
        sign, four = -sign, 4.0 * four
    return y, kk, yg
