"""All compiled code of slabsim: numbers in, numbers out.

SI is gone here: lengths are multiplied by k0, wavenumbers divided by it. Nothing is checked, nothing
raises; a point that cannot be solved comes out as NaN. The elementary functions stand in `vector_math.py`, and
`cache.py` sees to it that an edit there does not bring back old machine code.

State. Each polarization carries two tangential fields (a, b) with a' = i k0 m b:

    TM: a = hy, b = Ex,  m = eps        TE: a = Ey, b = -hx, m = mu

Wires along z add (v, psi) to TM, with w = i kp v and phi = i psi / kp, so that

    d/dz (hy, v) = i k0 eps (Ex, psi)      d^2/dz^2 (hy, v) = -k0^2 Q (hy, v)
    Q = [[A, c], [c, B]]   A = eps mu - s^2   B = eps - X   c = s kp / k0   X = (kp/k0)^2 - eps zc

with s = kx/k0 and zc = i zeta kp^2/k0. The power is Re(Ex hy* + psi v*).

Recursion, from the back to the front: (a, b) <- N (a, b), t <- t S. N/S is the chain matrix of the element,
multiplied through by exp(i kz d) of its modes, so nothing grows and nothing has a pole. Everything is
an even function of each kz. Where wires are joined, the plane of admissible states is carried by its
Pluecker coordinates (hv, h psi, e v, e psi, h e), in which the transfer is as bounded.

Points are done in chunks of `C`. All rows of a chunk lie in one flat array at literal offsets: only so does
the compiler see that they do not overlap, and turns the inner loops into vector instructions. The names of
the rows are in `rows.py`.
"""

import math

import numpy as np
from numba import njit

from slabsim.engine.rows import *
from slabsim.engine.vector_math import FAST as _FAST
from slabsim.engine.vector_math import TINY as _TINY
from slabsim.engine.vector_math import inverse as _inverse
from slabsim.engine.vector_math import root as _root
from slabsim.engine.vector_math import select as _select
from slabsim.engine.vector_math import wave as _wave


# Inlined into the two entry points by the compiler: a kernel that was compiled for itself first would be found under the
# same name by the linker, and it is not vectorised.
kernel = njit(nogil=True, error_model="numpy", fastmath=_FAST, forceinline=True)


@njit(inline="always")
def _get(w, row, i):
    return complex(w[row * C + i], w[(row + 1) * C + i])


@njit(inline="always")
def _put(w, row, i, z):
    w[row * C + i] = z.real
    w[(row + 1) * C + i] = z.imag


@njit(inline="always")
def _advance(w, row, i, p, c, mg, wm):
    """(a, b) <- (c a + m g b, kappa^2 g / m a + c b), t <- t p."""
    a, b = _get(w, row, i), _get(w, row + 2, i)
    _put(w, row, i, c * a + mg * b)
    _put(w, row + 2, i, wm * a + c * b)
    _put(w, row + 4, i, p * _get(w, row + 4, i))


@kernel
def _plain(w, n, te, tm):
    """A layer without wires, the polarizations asked for."""
    for i in range(n):
        k2 = _get(w, EXCESS, i) + w[Q2 * C + i]
        p, c, g = _wave(k2, w[DEPTH * C + i])
        gk = g * k2
        if te:
            _advance(w, TE, i, p, c, _get(w, MU, i) * g, _get(w, INV_MU, i) * gk)
        if tm:
            _advance(w, TM, i, p, c, _get(w, EPS, i) * g, _get(w, INV_EPS, i) * gk)


@kernel
def _uniaxial_tm(w, n):
    """TM through wires in the local model: kz^2 = eps (mu - s^2/eps_zz)."""
    for i in range(n):
        k2 = _get(w, EXCESS, i) + w[Q2 * C + i] + _get(w, STRETCH, i) * w[S2 * C + i]
        p, c, g = _wave(k2, w[DEPTH * C + i])
        _advance(w, TM, i, p, c, _get(w, EPS, i) * g, _get(w, INV_EPS, i) * (g * k2))


@kernel
def _sheet(w, n, te, tm):
    """Zero-thickness sheet: the magnetic field steps by y E_t."""
    form = w[FORM * C]
    for i in range(n):
        y_te = _get(w, Y_SHEET, i)
        y_tm = y_te
        oblique = 1.0 - w[S2 * C + i] * _get(w, TILT, i)
        if form == PATCHES:
            y_te = y_te * oblique
        elif form == STRIPS:
            y_tm = y_tm * _inverse(oblique)
        if te:
            _put(w, TE + 2, i, _get(w, TE + 2, i) + y_te * _get(w, TE, i))
        if tm:
            _put(w, TM, i, _get(w, TM, i) + y_tm * _get(w, TM + 2, i))


@kernel
def _modes(w, n):
    """The two eigenvalues of Q, and every symmetric function of the two modes that a wire layer needs.

    With x1, x2 the values of one function at the two modes and gap = l1 - l2, a symmetric function is either a
    mean (x1 + x2)/2 or a divided difference (x1 - x2)/gap. Rows:

        CC = c1 c2        D = g1 g2         PI = p1 p2        H = (c1 g2 + c2 g1)/2   HW = (c1 w2 + c2 w1)/2
        Y = (c1 g2 - c2 g1)/gap             YW = (c1 w2 - c2 w1)/gap                  w = kappa^2 g
        KK = 2 (CC - PI - (l1 + l2) D/2)/gap^2
        XC, XG, XW: means of cos, g, w of the modes, times PI;   YC, YG, YWW: their divided differences

    Points where the gap closes, or where the layer is thin, lose digits in the differences; they are marked
    in the row RARE and done again by `_rare_modes`.
    """
    rare = False
    for i in range(n):
        depth = w[DEPTH * C + i]
        s2 = w[S2 * C + i]
        eps, mu = _get(w, EPS, i), _get(w, MU, i)
        x_wire, zc = _get(w, X_WIRE, i), _get(w, ZC, i)
        a = _get(w, EXCESS, i) + w[Q2 * C + i]
        c2 = s2 * w[KP2 * C + i]
        diff = eps * (mu - 1.0) - s2 + x_wire  # A - B
        det = eps * (a - mu * x_wire - s2 * zc)
        mean = a - 0.5 * diff
        gap, gap2 = _root(diff * diff + 4.0 * c2)
        # the larger root by addition, the smaller from the determinant: no cancellation
        adds = mean.real * gap.real + mean.imag * gap.imag >= 0.0
        gap = complex(_select(adds, gap.real, -gap.real), _select(adds, gap.imag, -gap.imag))
        l1 = mean + 0.5 * gap
        l1 = complex(l1.real + _TINY, l1.imag)
        l2 = det * _inverse(l1)
        p1, c1, g1 = _wave(l1, depth)
        p2, cb, g2 = _wave(l2, depth)
        w1, w2 = l1 * g1, l2 * g2
        inv = _inverse(complex(gap.real + _TINY, gap.imag))
        cc, d, pp = c1 * cb, g1 * g2, p1 * p2
        _put(w, CC, i, cc)
        _put(w, D, i, d)
        _put(w, PI, i, pp)
        _put(w, H, i, 0.5 * (c1 * g2 + cb * g1))
        _put(w, Y, i, (c1 * g2 - cb * g1) * inv)
        _put(w, KK, i, 2.0 * (cc - pp - mean * d) * inv * inv)
        _put(w, HW, i, 0.5 * (c1 * w2 + cb * w1))
        _put(w, YW, i, (c1 * w2 - cb * w1) * inv)
        _put(w, XC, i, 0.5 * (c1 * p2 + cb * p1))
        _put(w, YC, i, (c1 * p2 - cb * p1) * inv)
        _put(w, XG, i, 0.5 * (g1 * p2 + g2 * p1))
        _put(w, YG, i, (g1 * p2 - g2 * p1) * inv)
        _put(w, XW, i, 0.5 * (w1 * p2 + w2 * p1))
        _put(w, YWW, i, (w1 * p2 - w2 * p1) * inv)
        _put(w, MEAN, i, mean)
        _put(w, DA, i, 0.5 * diff)
        _put(w, DET, i, det)
        _put(w, L1, i, l1)
        _put(w, L2, i, l2)
        _put(w, GAP, i, gap)
        spread = 0.25 * (diff.real * diff.real + diff.imag * diff.imag) + c2
        size = abs(l1.real) + abs(l1.imag) + abs(l2.real) + abs(l2.imag)
        closing = (spread > 1e3 * gap2) | (gap2 < 1e-24 * size * size)
        thin = size * depth * depth < 1e-3
        w[RARE * C + i] = _select(closing | thin, 1.0, 0.0)
    for i in range(n):
        rare = rare | (w[RARE * C + i] > 0.0)
    if rare:
        for i in range(n):
            if w[RARE * C + i] > 0.0:
                _rare_modes(w, i)


@njit(nogil=True, error_model="numpy")
def _sinc(z):
    """sin(z)/z."""
    if abs(z) < 1e-4:
        return 1.0 - z * z / 6.0
    return np.sin(z) / z


@njit(nogil=True, error_model="numpy")
def _rare_modes(w, i):
    """The divided differences where the modes coalesce or the layer is thin, without cancellation.

    With m, n = half sum and half difference of the two phases and phi1 phi2 = m^2 - n^2:

        Y  = -i PI d^3/2 (sinc 2m - sinc 2n)/(phi1 phi2)      KK = PI d^4/4 (sinc^2 m - sinc^2 n)/(phi1 phi2)
        YC = -PI d^2/2 sinc m sinc n                          YG = -i PI d^3/2 (cos m sinc n - sinc m cos n)/(phi1 phi2)

    For small phases the quotients are summed as series; else PI = exp(2 i m) is multiplied in, so that no
    exponential grows.
    """
    depth = w[DEPTH * C + i]
    mean, gap = _get(w, MEAN, i), _get(w, GAP, i)
    k1, _ = _root(_get(w, L1, i))
    k2, _ = _root(_get(w, L2, i))
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
    _put(w, Y, i, y)
    _put(w, KK, i, kk)
    _put(w, YW, i, mean * y - _get(w, H, i))
    _put(w, YC, i, -0.5 * depth * depth * half * sinc_m * _sinc(n))
    _put(w, YG, i, yg)
    _put(w, YWW, i, mean * yg + _get(w, XG, i))


@njit(nogil=True, error_model="numpy")
def _naive_means(w, i, a, b, pi):
    """The means for phases a, b close to the real axis, one of them with the other sign of kappa."""
    depth = w[DEPTH * C + i]
    l1, l2 = _get(w, L1, i), _get(w, L2, i)
    cos_a, cos_b, sinc_a, sinc_b = np.cos(a), np.cos(b), _sinc(a), _sinc(b)
    _put(w, CC, i, pi * cos_a * cos_b)
    _put(w, D, i, -pi * depth * depth * sinc_a * sinc_b)
    _put(w, PI, i, pi)
    _put(w, H, i, -0.5j * pi * depth * (cos_a * sinc_b + cos_b * sinc_a))
    _put(w, HW, i, -0.5j * pi * depth * (cos_a * l2 * sinc_b + cos_b * l1 * sinc_a))
    _put(w, XC, i, 0.5 * pi * (cos_a + cos_b))
    _put(w, XG, i, -0.5j * pi * depth * (sinc_a + sinc_b))
    _put(w, XW, i, -0.5j * pi * depth * (l1 * sinc_a + l2 * sinc_b))


@njit(nogil=True, error_model="numpy")
def _quotient_series(m2, n2, a2, b2):
    """Quotients of `_rare_modes` for small phases; sums of the Taylor series of sinc 2x, sinc^2 x, sinc x."""
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


@njit(inline="always")
def _minors(w, i):
    """The 2x2 minors of a wire layer's transfer, named by rows | columns:

    hv|hv, hp|hp, hv|hp, hv|ev, hp|hv, ev|hv, ev|hp, hp|ev, hv|ep, ep|hv, with p for psi; others equal one of these.
    """
    eps, inv_eps = _get(w, EPS, i), _get(w, INV_EPS, i)
    half, mean, d, cc = _get(w, DA, i), _get(w, MEAN, i), _get(w, D, i), _get(w, CC, i)
    ckk = w[S2 * C + i] * w[KP2 * C + i] * _get(w, KK, i)
    h, dy = _get(w, H, i), half * _get(w, Y, i)
    hw, dyw = _get(w, HW, i), half * _get(w, YW, i)
    return (
        cc,
        cc - ckk,
        eps * (h + dy),
        eps * (h - dy),
        inv_eps * (hw + dyw),
        inv_eps * (hw - dyw),
        (mean + half) * d + ckk,
        (mean - half) * d + ckk,
        eps * eps * d,
        inv_eps * inv_eps * _get(w, DET, i) * d,
    )


@kernel
def _wires(w, n):
    """One wire layer whose ends are not joined, as a port of the fields alone."""
    for i in range(n):
        cc, u, a1, a2, b1, b2, v, v_swapped, ed, wd = _minors(w, i)
        pp, pf = _get(w, END_PP, i), _get(w, END_PF, i)
        fp, ff = _get(w, END_FP, i), _get(w, END_FF, i)
        half = _get(w, DA, i)
        m_vv = _get(w, XC, i) - half * _get(w, YC, i)
        m_vp = _get(w, EPS, i) * (_get(w, XG, i) - half * _get(w, YG, i))
        m_pv = _get(w, INV_EPS, i) * (_get(w, XW, i) - half * _get(w, YWW, i))
        hy, ex = _get(w, TM, i), _get(w, TM + 2, i)
        n_hh, n_he = pp * a1 + pf * cc - fp * u - ff * b1, pp * ed + (pf - fp) * a2 - ff * v_swapped
        n_eh, n_ee = pp * v + (pf - fp) * b2 - ff * wd, pp * a1 + pf * u - fp * cc - ff * b1
        _put(w, TM, i, n_hh * hy + n_he * ex)
        _put(w, TM + 2, i, n_eh * hy + n_ee * ex)
        _put(w, TM + 4, i, _get(w, TM + 4, i) * (pp * m_vp + (pf - fp) * m_vv - ff * m_pv))


@kernel
def _wire_back(w, n):
    """Enter a run of joined wires from behind: the plane of (hy, Ex) and the end condition (nu, omega)."""
    for i in range(n):
        nu, omega = _get(w, NU, i), _get(w, OMEGA, i)
        hy, ex = _get(w, TM, i), _get(w, TM + 2, i)
        _put(w, RUN, i, hy * nu)
        _put(w, RUN + 2, i, hy * omega)
        _put(w, RUN + 4, i, ex * nu)
        _put(w, RUN + 6, i, ex * omega)
        _put(w, RUN + 8, i, 0.0j)
        _put(w, RUN + 10, i, 0.0j)
        _put(w, RUN + 12, i, nu)
        _put(w, RUN + 14, i, 0.0j)
        _put(w, RUN + 16, i, omega)


@njit(inline="always")
def _transfer(w, i, h, v, e, psi):
    """PI M (h, v, e, psi): the 4x4 transfer of a wire layer, back to front."""
    eps, inv_eps = _get(w, EPS, i), _get(w, INV_EPS, i)
    c = w[KP * C + i] * math.sqrt(w[S2 * C + i])
    half = _get(w, DA, i)
    xc, yc = _get(w, XC, i), _get(w, YC, i)
    xg, yg = _get(w, XG, i), _get(w, YG, i)
    xw, yw = _get(w, XW, i), _get(w, YWW, i)
    ge, gp = eps * e, eps * psi
    wh, wv = inv_eps * h, inv_eps * v
    return (
        (xc + half * yc) * h + c * yc * v + (xg + half * yg) * ge + c * yg * gp,
        (xc - half * yc) * v + c * yc * h + (xg - half * yg) * gp + c * yg * ge,
        (xc + half * yc) * e + c * yc * psi + (xw + half * yw) * wh + c * yw * wv,
        (xc - half * yc) * psi + c * yc * e + (xw - half * yw) * wv + c * yw * wh,
    )


@kernel
def _wire_run(w, n):
    """A wire layer inside a run: the second compound of its transfer on the plane, the transfer on the vector."""
    for i in range(n):
        cc, u, a1, a2, b1, b2, v, v_swapped, ed, wd = _minors(w, i)
        c = w[KP * C + i] * math.sqrt(w[S2 * C + i])
        half, d, ckk = _get(w, DA, i), _get(w, D, i), c * _get(w, KK, i)
        plus, minus = half * ckk + 0.5 * c * d, half * ckk - 0.5 * c * d
        cy, cyw = _get(w, EPS, i) * (c * _get(w, Y, i)), _get(w, INV_EPS, i) * (c * _get(w, YW, i))
        hv, hp = _get(w, RUN, i), _get(w, RUN + 2, i)
        ev, ep, he = _get(w, RUN + 4, i), _get(w, RUN + 6, i), _get(w, RUN + 8, i)
        _put(w, RUN, i, cc * hv + a1 * hp + a2 * ev + ed * ep - 2.0 * cy * he)
        _put(w, RUN + 2, i, b1 * hv + u * hp + v_swapped * ev + a2 * ep - 2.0 * plus * he)
        _put(w, RUN + 4, i, b2 * hv + v * hp + u * ev + a1 * ep + 2.0 * minus * he)
        _put(w, RUN + 6, i, wd * hv + b2 * hp + b1 * ev + cc * ep + 2.0 * cyw * he)
        _put(w, RUN + 8, i, (_get(w, PI, i) + 2.0 * c * ckk) * he - cyw * hv - minus * hp + plus * ev + cy * ep)
        h, e = _get(w, RUN + 10, i), _get(w, RUN + 14, i)
        h, v, e, psi = _transfer(w, i, h, _get(w, RUN + 12, i), e, _get(w, RUN + 16, i))
        _put(w, RUN + 10, i, h)
        _put(w, RUN + 12, i, v)
        _put(w, RUN + 14, i, e)
        _put(w, RUN + 16, i, psi)


@kernel
def _wire_joint(w, n):
    """Wires joined: w continuous, phi continuous or dropping over a series load."""
    for i in range(n):
        ratio, load = w[RATIO * C + i], _get(w, LOAD, i)
        _step_potential(w, i, RUN, RUN + 2, ratio, load)  # h v, h psi
        _step_potential(w, i, RUN + 4, RUN + 6, ratio, load)  # e v, e psi
        _step_potential(w, i, RUN + 12, RUN + 16, ratio, load)  # v, psi


@njit(inline="always")
def _step_potential(w, i, row_v, row_psi, ratio, load):
    v = ratio * _get(w, row_v, i)
    _put(w, row_v, i, v)
    _put(w, row_psi, i, _get(w, row_psi, i) * (1.0 / ratio) + load * v)


@kernel
def _wire_front(w, n):
    """Leave a run at its front end: the state of the plane that meets the end condition."""
    for i in range(n):
        nu, omega = _get(w, NU, i), _get(w, OMEGA, i)
        _put(w, TM, i, omega * _get(w, RUN, i) - nu * _get(w, RUN + 2, i))
        _put(w, TM + 2, i, omega * _get(w, RUN + 4, i) - nu * _get(w, RUN + 6, i))
        s = omega * _get(w, RUN + 12, i) - nu * _get(w, RUN + 16, i)
        _put(w, TM + 4, i, _get(w, TM + 4, i) * s)


@kernel
def _normalise(w, n, te, tm):
    """Scale the states to unit size, and their transmissions alike."""
    for i in range(n):
        if te:
            _rescale(w, i, TE, TE + 4)
        if tm:
            _rescale(w, i, TM, TM + 4)


@kernel
def _normalise_run(w, n):
    """Scale the plane of a run to unit size, and its vector alike."""
    for i in range(n):
        size = 1e-300
        for r in (0, 1, 2, 3, 4, 5, 6, 7, 8, 9):
            size += abs(w[(RUN + r) * C + i])
        scale = 1.0 / size
        w[SCALE * C + i] = scale
        for r in (0, 1, 2, 3, 4, 5, 6, 7, 8, 9, 10, 11, 12, 13, 14, 15, 16, 17):
            w[(RUN + r) * C + i] *= scale


@njit(inline="always")
def _rescale(w, i, row, t_row):
    a, b = _get(w, row, i), _get(w, row + 2, i)
    scale = 1.0 / (abs(a.real) + abs(a.imag) + abs(b.real) + abs(b.imag) + 1e-300)
    w[SCALE * C + i] = scale
    _put(w, row, i, scale * a)
    _put(w, row + 2, i, scale * b)
    _put(w, t_row, i, scale * _get(w, t_row, i))


@kernel
def _element(w, n, kind, te, tm):
    """One element of the recipe, back to front."""
    if kind == PLAIN:
        _plain(w, n, te, tm)
    elif kind == SHEET:
        _sheet(w, n, te, tm)
    elif kind == WIRE_BACK:
        _wire_back(w, n)
    elif kind == WIRE_JOINT:
        _wire_joint(w, n)
    elif kind == WIRE_FRONT:
        _wire_front(w, n)
    else:
        if te:
            _plain(w, n, te, False)  # TE does not see the wires
        if tm and kind == UNIAXIAL:
            _uniaxial_tm(w, n)
        elif tm:
            _modes(w, n)
            if kind == WIRES:
                _wires(w, n)
            else:
                _wire_run(w, n)
    in_run = kind in (WIRE_BACK, WIRE_RUN, WIRE_JOINT)
    _normalise(w, n, te, tm and not in_run)
    if tm and in_run:
        _normalise_run(w, n)


@kernel
def _load(w, n, table, f, by_angle):
    """Lay one element's table into the workspace: its column f, or the n columns from f on."""
    for k in range(table.shape[0]):
        if by_angle:
            value = table[k, f]
            for i in range(n):
                w[k * C + i] = value
        else:
            for i in range(n):
                w[k * C + i] = table[k, f + i]


@njit(inline="always")
def _outgoing(k2, inv_m):
    """kappa/m of the wave that leaves: it decays, or carries power away where it does not."""
    kappa, _ = _root(k2)
    z = kappa * inv_m
    return complex(_select((k2.imag == 0.0) & (z.real < 0.0), -z.real, z.real), z.imag)


@njit(inline="always")
def _outgoing(k2, inv_m):
    """kappa/m of the wave that leaves: it decays, or carries power away where it does not."""
    kappa, _ = _root(k2)
    z = kappa * inv_m
    return complex(_select((k2.imag == 0.0) & (z.real < 0.0), -z.real, z.real), z.imag)


@kernel
def _begin(w, n, metal_back):
    """State behind the last element, from the media (in the rows of the table) and the angles."""
    back = 0.0 if metal_back else 1.0
    for i in range(n):
        index2 = w[FRONT_EPS * C + i] * w[FRONT_MU * C + i]
        w[S2 * C + i] *= index2
        w[Q2 * C + i] *= index2
        eps, mu = _get(w, BACK_EPS, i), _get(w, BACK_MU, i)
        k2 = eps * mu - index2 + w[Q2 * C + i]
        _put(w, TE, i, complex(back, 0.0))
        _put(w, TE + 2, i, (1.0 - back) + back * _outgoing(k2, _inverse(mu)))
        _put(w, TE + 4, i, complex(back, 0.0))
        _put(w, TM, i, complex(1.0, 0.0))
        _put(w, TM + 2, i, back * _outgoing(k2, _inverse(eps)))
        _put(w, TM + 4, i, complex(back, 0.0))


@kernel
def _end(w, n):
    """r, t, R, T of both polarizations from the state at the front face; t is the ratio of the field a."""
    for i in range(n):
        eps, mu = w[FRONT_EPS * C + i], w[FRONT_MU * C + i]
        q2 = w[Q2 * C + i]
        q = math.sqrt(q2)
        eps_back, mu_back = _get(w, BACK_EPS, i), _get(w, BACK_MU, i)
        k2 = eps_back * mu_back - eps * mu + q2
        _finish(w, i, TE, q / mu, _outgoing(k2, _inverse(mu_back)).real, RESULT)
        _finish(w, i, TM, q / eps, _outgoing(k2, _inverse(eps_back)).real, RESULT + N_OUT)


@njit(inline="always")
def _finish(w, i, row, z_front, z_back, result):
    a, b, t = _get(w, row, i), _get(w, row + 2, i), _get(w, row + 4, i)
    inv = _inverse(z_front * a + b)
    r = (z_front * a - b) * inv
    t = 2.0 * z_front * t * inv
    _put(w, result + R_RE, i, r)
    _put(w, result + T_RE, i, t)
    w[(result + R_POWER) * C + i] = r.real * r.real + r.imag * r.imag
    w[(result + T_POWER) * C + i] = (t.real * t.real + t.imag * t.imag) * z_back / z_front


@kernel
def _chunk(w, n, kinds, rows, tables, media, at, by_angle, switches, trace):
    """Solve the n points whose sin^2 and cos^2 stand in the workspace, from column `at` of the tables on.

    If `trace` has room, the workspace after `_begin` and after each element goes there; the transmission
    then restarts at 1 in every element.
    """
    metal_back, te, tm = switches[0], switches[1], switches[2]
    _load(w, n, media, at, by_angle)
    _begin(w, n, metal_back)
    for e in range(kinds.size):
        if trace.shape[0] > 0:
            trace[e] = w
            for i in range(n):
                _put(w, TE + 4, i, 1.0 + 0.0j)
                _put(w, TM + 4, i, 1.0 + 0.0j)
        _load(w, n, tables[rows[e]], at, by_angle)
        _element(w, n, kinds[e], te, tm)
    if trace.shape[0] > 0:
        trace[kinds.size] = w
    _load(w, n, media, at, by_angle)
    _end(w, n)


@njit(nogil=True, cache=True, error_model="numpy")
def solve(kinds, rows, tables, media, sin2, cos2, switches, out):
    """Solve a grid of frequencies and angles.

    Parameters
    ----------
    kinds, rows : int64 arrays, shape (n_elements,)
        Kind of each element, back to front; its index in `tables`.
    tables : float array, shape (n_tables, N_PARAMS, n_freqs)
    media : float array, shape (N_MEDIA, n_freqs)
    sin2, cos2 : float arrays, shape (n_angles,)
        Squares of sine and cosine of the angle of incidence in the front medium.
    switches : bool array, shape (3,)
        Back is a perfect conductor; TE wanted; TM wanted.
    out : float array, shape (2, N_OUT, n_freqs, n_angles)
        Filled: TE, TM.
    """
    n_freqs, n_angles = media.shape[1], sin2.size
    w = np.zeros(N_ROWS * C)
    nothing = np.empty((0, N_ROWS * C))
    by_angle = n_angles >= min(n_freqs, C)  # the longer axis goes through the vector loops
    outer, inner = (n_freqs, n_angles) if by_angle else (n_angles, n_freqs)
    for o in range(outer):
        for i0 in range(0, inner, C):
            n = min(C, inner - i0)
            for i in range(n):
                a = i0 + i if by_angle else o
                w[S2 * C + i], w[Q2 * C + i] = sin2[a], cos2[a]
            _chunk(w, n, kinds, rows, tables, media, o if by_angle else i0, by_angle, switches, nothing)
            for p in range(2):
                for k in range(N_OUT):
                    row = (RESULT + p * N_OUT + k) * C
                    for i in range(n):
                        if by_angle:
                            out[p, k, o, i0 + i] = w[row + i]
                        else:
                            out[p, k, i0 + i, o] = w[row + i]


@njit(nogil=True, cache=True, error_model="numpy")
def trace(kinds, rows, tables, media, sin2, cos2, switches, states):
    """Workspace behind and after every element, at one frequency and at most C angles.

    Arrays as in `solve`, with n_freqs = 1; `states`: float array, shape (n_elements + 1, N_ROWS * C).
    """
    w = np.zeros(N_ROWS * C)
    for i in range(sin2.size):
        w[S2 * C + i], w[Q2 * C + i] = sin2[i], cos2[i]
    _chunk(w, sin2.size, kinds, rows, tables, media, 0, True, switches, states)
