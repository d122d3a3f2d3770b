"""The two ends of the recursion: the wave that leaves behind, the waves that come and return in front."""

import math

from numba import njit

from slabsim.engine.coalescing import get, put
from slabsim.engine.rows import *
from slabsim.engine.vector_math import FAST, inverse, root, select

# Each kernel is compiled for itself: with all of them in one function the compiler no longer vectorises every loop.
kernel = njit(nogil=True, cache=True, error_model="numpy", fastmath=FAST, _nrt=False)


@njit(inline="always")
def outgoing(k2, inv_m):
    """kappa/m of the wave that leaves: it decays, or carries power away where it does not."""
    kappa, _ = root(k2)
    z = kappa * inv_m
    return complex(select((k2.imag == 0.0) & (z.real < 0.0), -z.real, z.real), z.imag)


@kernel
def begin(w, n, metal_back):
    """State behind the last element, from the media (in the rows of the table) and the angles."""
    back = 0.0 if metal_back else 1.0
    for i in range(n):
        index2 = w[FRONT_EPS * C + i] * w[FRONT_MU * C + i]
        w[S2 * C + i] *= index2
        w[Q2 * C + i] *= index2
        eps, mu = get(w, BACK_EPS, i), get(w, BACK_MU, i)
        k2 = eps * mu - index2 + w[Q2 * C + i]
        put(w, TE, i, complex(back, 0.0))
        put(w, TE + 2, i, (1.0 - back) + back * outgoing(k2, inverse(mu)))
        put(w, TE + 4, i, complex(back, 0.0))
        put(w, TM, i, complex(1.0, 0.0))
        put(w, TM + 2, i, back * outgoing(k2, inverse(eps)))
        put(w, TM + 4, i, complex(back, 0.0))


@kernel
def end(w, n):
    """r, t, R, T, A of both polarizations from the state at the front face."""
    for i in range(n):
        eps, mu = w[FRONT_EPS * C + i], w[FRONT_MU * C + i]
        q2 = w[Q2 * C + i]
        q = math.sqrt(q2)
        eps_back, mu_back = get(w, BACK_EPS, i), get(w, BACK_MU, i)
        k2 = eps_back * mu_back - eps * mu + q2
        one = complex(1.0, 0.0)
        _finish(w, i, TE, q / mu, outgoing(k2, inverse(mu_back)).real, one, RESULT)
        _finish(w, i, TM, q / eps, outgoing(k2, inverse(eps_back)).real, get(w, E_OVER_H, i), RESULT + N_OUT)


@njit(inline="always")
def _finish(w, i, row, z_front, z_back, t_factor, result):
    a, b, t = get(w, row, i), get(w, row + 2, i), get(w, row + 4, i)
    inv = inverse(z_front * a + b)
    r = (z_front * a - b) * inv
    t = 2.0 * z_front * t * inv
    R = r.real * r.real + r.imag * r.imag
    T = (t.real * t.real + t.imag * t.imag) * z_back / z_front
    put(w, result + R_AMPLITUDE, i, r)
    put(w, result + T_AMPLITUDE, i, t * t_factor)
    w[(result + R_POWER) * C + i] = R
    w[(result + T_POWER) * C + i] = T
    w[(result + A_POWER) * C + i] = 1.0 - R - T
