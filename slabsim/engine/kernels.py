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

from slabsim.engine.coalescing import get as _get
from slabsim.engine.coalescing import put as _put
from slabsim.engine.coalescing import rare_modes
from slabsim.engine.half_spaces import begin, end, kernel
from slabsim.engine.rows import *
from slabsim.engine.vector_math import TINY as _TINY
from slabsim.engine.vector_math import decay as _decay
from slabsim.engine.vector_math import inverse as _inverse
from slabsim.engine.vector_math import root as _root
from slabsim.engine.vector_math import select as _select
from slabsim.engine.vector_math import sincos as _sincos
from slabsim.engine.vector_math import wave as _wave


@kernel
def _waves(w, n, row):
    """p, c, g of a mode (rows P, Q, G from `row` on), whose kappa^2 stands in the rows K2.

    Four short loops are twice as fast as one: the latency of a root followed by exponentials is hidden only if several
    points are on their way at once.
    """
    for i in range(n):
        kappa, inv_size = _root(_get(w, row + K2, i))
        _put(w, row + KAPPA, i, kappa)
        w[(row + INV_SIZE) * C + i] = inv_size
    for i in range(n):
        em1, e = _decay(-w[(row + KAPPA + 1) * C + i] * w[DEPTH * C + i])
        w[(row + EM1) * C + i], w[(row + EXP) * C + i] = em1, e
    for i in range(n):
        sn, cs = _sincos(w[(row + KAPPA) * C + i] * w[DEPTH * C + i])
        w[(row + SIN) * C + i], w[(row + COS) * C + i] = sn, cs
    for i in range(n):
        em1, e = w[(row + EM1) * C + i], w[(row + EXP) * C + i]
        sn, cs = w[(row + SIN) * C + i], w[(row + COS) * C + i]
        p, c, g = _wave(_get(w, row + KAPPA, i), w[(row + INV_SIZE) * C + i], em1, e, sn, cs)
        _put(w, row + WAVE_P, i, p)
        _put(w, row + WAVE_C, i, c)
        _put(w, row + WAVE_G, i, g)


@kernel
def _plain(w, n, te, tm):
    """A layer without wires, the polarizations asked for."""
    for i in range(n):
        _put(w, FIRST + K2, i, _get(w, EXCESS, i) + w[Q2 * C + i])
    _waves(w, n, FIRST)
    if te:
        _advance(w, n, TE, MU)
    if tm:
        _advance(w, n, TM, EPS)


@kernel
def _advance(w, n, row, m):
    """(a, b) <- (c a + m g b, kappa^2 g / m a + c b), t <- t p; m is eps or mu, 1/m stands behind it."""
    for i in range(n):
        p, c, g = _get(w, FIRST + WAVE_P, i), _get(w, FIRST + WAVE_C, i), _get(w, FIRST + WAVE_G, i)
        a, b = _get(w, row, i), _get(w, row + 2, i)
        _put(w, row, i, c * a + _get(w, m, i) * g * b)
        _put(w, row + 2, i, _get(w, m + 2, i) * (g * _get(w, FIRST + K2, i)) * a + c * b)
        _put(w, row + 4, i, p * _get(w, row + 4, i))


@kernel
def _transparent(w, n, te, tm):
    """A lossless layer at least as dense as the front: kz is real, and so are the chain matrices but for a factor i."""
    for i in range(n):
        k2 = w[EXCESS * C + i] + w[Q2 * C + i]
        kappa = math.sqrt(k2 + _TINY)
        sn, cs = _sincos(kappa * w[DEPTH * C + i])
        g = sn / kappa
        if te:
            _turn(w, TE, i, cs, w[MU * C + i] * g, w[INV_MU * C + i] * g * k2)
        if tm:
            _turn(w, TM, i, cs, w[EPS * C + i] * g, w[INV_EPS * C + i] * g * k2)


@njit(inline="always")
def _turn(w, row, i, c, ms, ws):
    """(a, b) <- (c a - i m s b, -i kappa^2 s / m a + c b)."""
    a, b = _get(w, row, i), _get(w, row + 2, i)
    _put(w, row, i, complex(c * a.real + ms * b.imag, c * a.imag - ms * b.real))
    _put(w, row + 2, i, complex(c * b.real + ws * a.imag, c * b.imag - ws * a.real))


@kernel
def _uniaxial_tm(w, n):
    """TM through wires in the local model: kz^2 = eps (mu - s^2/eps_zz)."""
    for i in range(n):
        _put(w, FIRST + K2, i, _get(w, EXCESS, i) + w[Q2 * C + i] + _get(w, STRETCH, i) * w[S2 * C + i])
    _waves(w, n, FIRST)
    _advance(w, n, TM, EPS)


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
    in the row RARE and done again by `rare_modes`.
    """
    for i in range(n):
        s2, eps, mu = w[S2 * C + i], _get(w, EPS, i), _get(w, MU, i)
        x_wire = _get(w, X_WIRE, i)
        a = _get(w, EXCESS, i) + w[Q2 * C + i]
        diff = eps * (mu - 1.0) - s2 + x_wire  # A - B
        gap, inv_gap2 = _root(diff * diff + 4.0 * (s2 * w[KP2 * C + i]))
        _put(w, DA, i, 0.5 * diff)
        _put(w, DET, i, eps * (a - mu * x_wire - s2 * _get(w, ZC, i)))
        _put(w, MEAN, i, a - 0.5 * diff)
        _put(w, GAP, i, gap)
        w[INV_GAP2 * C + i] = inv_gap2
    _squares(w, n)
    _waves(w, n, FIRST)
    _waves(w, n, SECOND)


@kernel
def _squares(w, n):
    """kappa^2 of both modes: the larger root by addition, the smaller from the determinant, so that nothing cancels."""
    for i in range(n):
        mean, gap = _get(w, MEAN, i), _get(w, GAP, i)
        adds = mean.real * gap.real + mean.imag * gap.imag >= 0.0
        gap = complex(_select(adds, gap.real, -gap.real), _select(adds, gap.imag, -gap.imag))
        larger = mean + 0.5 * gap
        larger = complex(larger.real + _TINY, larger.imag)
        _put(w, GAP, i, gap)
        _put(w, FIRST + K2, i, larger)
        _put(w, SECOND + K2, i, _get(w, DET, i) * _inverse(larger))


@kernel
def _ideal_modes(w, n):
    """The same for perfect conductors in a non-magnetic host: the TEM mode, l1 = eps, depends on frequency alone."""
    for i in range(n):
        eps, s2, kp2 = _get(w, EPS, i), w[S2 * C + i], w[KP2 * C + i]
        l2 = _get(w, EXCESS, i) + w[Q2 * C + i] - kp2
        _put(w, DA, i, complex(0.5 * (kp2 - s2), 0.0))
        _put(w, DET, i, eps * l2)
        _put(w, MEAN, i, 0.5 * (eps + l2))
        _put(w, GAP, i, complex(kp2 + s2, 0.0))
        w[INV_GAP2 * C + i] = 1.0 / ((kp2 + s2) * (kp2 + s2))
        _put(w, FIRST + K2, i, eps)
        _put(w, SECOND + K2, i, l2)
        _put(w, FIRST + WAVE_P, i, _get(w, TEM, i))
        _put(w, FIRST + WAVE_C, i, _get(w, TEM + 2, i))
        _put(w, FIRST + WAVE_G, i, _get(w, TEM + 4, i))
    _waves(w, n, SECOND)


@kernel
def _combine(w, n):
    """The symmetric functions of the two modes that the fields need. (Longer loops are not vectorised.)"""
    for i in range(n):
        c1, g1, l1 = _get(w, FIRST + WAVE_C, i), _get(w, FIRST + WAVE_G, i), _get(w, FIRST + K2, i)
        c2, g2, l2 = _get(w, SECOND + WAVE_C, i), _get(w, SECOND + WAVE_G, i), _get(w, SECOND + K2, i)
        gap, inv_gap2 = _get(w, GAP, i), w[INV_GAP2 * C + i]
        inv = complex(gap.real * inv_gap2, -gap.imag * inv_gap2)
        first, second = c1 * g2, c2 * g1
        _put(w, H, i, 0.5 * (first + second))
        _put(w, Y, i, (first - second) * inv)
        _put(w, HW, i, 0.5 * (first * l2 + second * l1))
        _put(w, YW, i, (first * l2 - second * l1) * inv)
        cc, d, pp = c1 * c2, g1 * g2, _get(w, FIRST + WAVE_P, i) * _get(w, SECOND + WAVE_P, i)
        _put(w, CC, i, cc)
        _put(w, D, i, d)
        _put(w, PI, i, pp)
        _put(w, KK, i, 2.0 * (cc - pp - _get(w, MEAN, i) * d) * inv * inv)


@kernel
def _combine_transfer(w, n):
    """The symmetric functions that the transmission needs."""
    for i in range(n):
        p1, c1, g1 = _get(w, FIRST + WAVE_P, i), _get(w, FIRST + WAVE_C, i), _get(w, FIRST + WAVE_G, i)
        p2, c2, g2 = _get(w, SECOND + WAVE_P, i), _get(w, SECOND + WAVE_C, i), _get(w, SECOND + WAVE_G, i)
        l1, l2 = _get(w, FIRST + K2, i), _get(w, SECOND + K2, i)
        gap, inv_gap2 = _get(w, GAP, i), w[INV_GAP2 * C + i]
        inv = complex(gap.real * inv_gap2, -gap.imag * inv_gap2)
        c1, c2, g1, g2 = c1 * p2, c2 * p1, g1 * p2, g2 * p1
        _put(w, XC, i, 0.5 * (c1 + c2))
        _put(w, YC, i, (c1 - c2) * inv)
        _put(w, XG, i, 0.5 * (g1 + g2))
        _put(w, YG, i, (g1 - g2) * inv)
        _put(w, XW, i, 0.5 * (l1 * g1 + l2 * g2))
        _put(w, YWW, i, (l1 * g1 - l2 * g2) * inv)


@kernel
def _mark_rare(w, n):
    """Mark the points where the modes coalesce or the layer is thin: `rare_modes` does them again."""
    for i in range(n):
        l1, l2, half = _get(w, FIRST + K2, i), _get(w, SECOND + K2, i), _get(w, DA, i)
        inv_gap2, depth = w[INV_GAP2 * C + i], w[DEPTH * C + i]
        spread = half.real * half.real + half.imag * half.imag + w[S2 * C + i] * w[KP2 * C + i]
        size = abs(l1.real) + abs(l1.imag) + abs(l2.real) + abs(l2.imag)
        closing = (spread * inv_gap2 > 1e3) | (size * size * inv_gap2 > 1e24)
        w[RARE * C + i] = _select(closing | (size * depth * depth < 1e-3), 1.0, 0.0)


@kernel
def _redo_rare(w, n):
    """Points where the modes coalesce or the layer is thin."""
    for i in range(n):
        if w[RARE * C + i] > 0.0:
            rare_modes(w, i)


@kernel
def _minors(w, n):
    """The 2x2 minors of a wire layer's transfer; M_xy_uv: rows x, y and columns u, v, with p for psi."""
    for i in range(n):
        eps, inv_eps = _get(w, EPS, i), _get(w, INV_EPS, i)
        half, mean, d, cc = _get(w, DA, i), _get(w, MEAN, i), _get(w, D, i), _get(w, CC, i)
        ckk = w[S2 * C + i] * w[KP2 * C + i] * _get(w, KK, i)
        h, dy = _get(w, H, i), half * _get(w, Y, i)
        hw, dyw = _get(w, HW, i), half * _get(w, YW, i)
        _put(w, M_HP_HP, i, cc - ckk)
        _put(w, M_HV_HP, i, eps * (h + dy))
        _put(w, M_HV_EV, i, eps * (h - dy))
        _put(w, M_HP_HV, i, inv_eps * (hw + dyw))
        _put(w, M_EV_HV, i, inv_eps * (hw - dyw))
        _put(w, M_EV_HP, i, (mean + half) * d + ckk)
        _put(w, M_HP_EV, i, (mean - half) * d + ckk)
        _put(w, M_HV_EP, i, eps * eps * d)
        _put(w, M_EP_HV, i, inv_eps * inv_eps * _get(w, DET, i) * d)


@kernel
def _wires(w, n):
    """One wire layer whose ends are not joined, as a port of the fields alone."""
    for i in range(n):
        cc, u, a1, a2 = _get(w, CC, i), _get(w, M_HP_HP, i), _get(w, M_HV_HP, i), _get(w, M_HV_EV, i)
        b1, b2, v, v_swapped = _get(w, M_HP_HV, i), _get(w, M_EV_HV, i), _get(w, M_EV_HP, i), _get(w, M_HP_EV, i)
        ed, wd = _get(w, M_HV_EP, i), _get(w, M_EP_HV, i)
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


@kernel
def _transfer(w, n):
    """PI M on the vector of a run: the 4x4 transfer of a wire layer, back to front."""
    for i in range(n):
        eps, inv_eps = _get(w, EPS, i), _get(w, INV_EPS, i)
        c, half = w[KP * C + i] * math.sqrt(w[S2 * C + i]), _get(w, DA, i)
        xc, yc, dc = _get(w, XC, i), c * _get(w, YC, i), half * _get(w, YC, i)
        xg, yg, dg = _get(w, XG, i), c * _get(w, YG, i), half * _get(w, YG, i)
        xw, yw, dw = _get(w, XW, i), c * _get(w, YWW, i), half * _get(w, YWW, i)
        h, v, e, psi = _get(w, RUN + 10, i), _get(w, RUN + 12, i), _get(w, RUN + 14, i), _get(w, RUN + 16, i)
        ge, gp, wh, wv = eps * e, eps * psi, inv_eps * h, inv_eps * v
        _put(w, RUN + 10, i, (xc + dc) * h + yc * v + (xg + dg) * ge + yg * gp)
        _put(w, RUN + 12, i, (xc - dc) * v + yc * h + (xg - dg) * gp + yg * ge)
        _put(w, RUN + 14, i, (xc + dc) * e + yc * psi + (xw + dw) * wh + yw * wv)
        _put(w, RUN + 16, i, (xc - dc) * psi + yc * e + (xw - dw) * wv + yw * wh)


@kernel
def _wire_run(w, n):
    """A wire layer inside a run: the second compound of its transfer, on the plane."""
    for i in range(n):
        cc, u, a1, a2 = _get(w, CC, i), _get(w, M_HP_HP, i), _get(w, M_HV_HP, i), _get(w, M_HV_EV, i)
        b1, b2, v, v_swapped = _get(w, M_HP_HV, i), _get(w, M_EV_HV, i), _get(w, M_EV_HP, i), _get(w, M_HP_EV, i)
        ed, wd = _get(w, M_HV_EP, i), _get(w, M_EP_HV, i)
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
        for r in (0, 1, 2, 3, 4, 5, 6, 7, 8, 9, 10, 11, 12, 13, 14, 15, 16, 17):
            w[(RUN + r) * C + i] *= scale


@njit(inline="always")
def _rescale(w, i, row, t_row):
    a, b = _get(w, row, i), _get(w, row + 2, i)
    scale = 1.0 / (abs(a.real) + abs(a.imag) + abs(b.real) + abs(b.imag) + 1e-300)
    _put(w, row, i, scale * a)
    _put(w, row + 2, i, scale * b)
    _put(w, t_row, i, scale * _get(w, t_row, i))


@kernel
def _element(w, n, kind, te, tm, normalise):
    """One element of the recipe, back to front."""
    if kind == PLAIN:
        _plain(w, n, te, tm)
    elif kind == TRANSPARENT:
        _transparent(w, n, te, tm)
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
            if w[IDEAL * C] > 0.0:
                _ideal_modes(w, n)
            else:
                _modes(w, n)
            _combine(w, n)
            _combine_transfer(w, n)
            _mark_rare(w, n)
            _redo_rare(w, n)
            _minors(w, n)
            if kind == WIRES:
                _wires(w, n)
            else:
                _wire_run(w, n)
                _transfer(w, n)
    if kind in (WIRE_BACK, WIRE_RUN, WIRE_JOINT):
        _normalise_run(w, n)
    elif normalise:
        _normalise(w, n, te, tm)


@kernel
def _load(w, n, table, n_rows, f, by_angle):
    """Lay one element's table into the workspace: its column f, or the n columns from f on, the last repeated."""
    known = min(n, table.shape[1] - f)
    for k in range(n_rows):
        if by_angle:
            value = table[k, f]
            for i in range(n):
                w[k * C + i] = value
        else:
            for i in range(known):
                w[k * C + i] = table[k, f + i]
            for i in range(known, n):
                w[k * C + i] = table[k, f + known - 1]


@kernel
def _chunk(w, n, kinds, rows, tables, media, at, by_angle, switches):
    """Solve the n points whose sin^2 and cos^2 stand in the workspace, from column `at` of the tables on."""
    metal_back, te, tm = switches[0], switches[1], switches[2]
    _load(w, n, media, N_MEDIA, at, by_angle)
    begin(w, n, metal_back)
    for e in range(kinds.size):
        _load(w, n, tables[rows[e]], PLAIN_ROWS if kinds[e] <= TRANSPARENT else N_PARAMS, at, by_angle)
        _element(w, n, kinds[e], te, tm, e % 8 == 7 or e == kinds.size - 1)
    _load(w, n, media, N_MEDIA, at, by_angle)
    end(w, n)


@njit(nogil=True, cache=True, error_model="numpy")
def solve(kinds, rows, tables, media, sin2, cos2, switches, amplitudes, powers):
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
    amplitudes : complex array, shape (n_pol, 2, n_freqs, n_angles)
        Filled with r, t of the wanted polarizations, TE before TM.
    powers : float array, shape (n_pol, 3, n_freqs, n_angles)
        Filled with R, T, A.
    """
    n_freqs, n_angles = media.shape[1], sin2.size
    w = np.zeros(N_ROWS * C)
    by_angle = n_angles >= min(n_freqs, C)  # the longer axis goes through the vector loops
    outer, inner = (n_freqs, n_angles) if by_angle else (n_angles, n_freqs)
    for o in range(outer):
        for i0 in range(0, inner, C):
            n = min(C, inner - i0)
            lanes = (n + LANES - 1) // LANES * LANES  # the last point fills up the last vector
            for i in range(lanes):
                a = min(i0 + i, n_angles - 1) if by_angle else o
                w[S2 * C + i], w[Q2 * C + i] = sin2[a], cos2[a]
            _chunk(w, lanes, kinds, rows, tables, media, o if by_angle else i0, by_angle, switches)
            for p in range(powers.shape[0]):
                result = RESULT if switches[1] and p == 0 else RESULT + N_OUT
                for i in range(n):
                    f, a = (o, i0 + i) if by_angle else (i0 + i, o)
                    amplitudes[p, 0, f, a] = _get(w, result + R_AMPLITUDE, i)
                    amplitudes[p, 1, f, a] = _get(w, result + T_AMPLITUDE, i)
                    powers[p, 0, f, a] = w[(result + R_POWER) * C + i]
                    powers[p, 1, f, a] = w[(result + T_POWER) * C + i]
                    powers[p, 2, f, a] = w[(result + A_POWER) * C + i]
