"""Small complex matrices of eight points at once, in a flat float array `b`.

Element (i, j) of an n by m matrix at offset x: real parts at x + 16 (i m + j), imaginary parts 8 further on. No
function pivots: the matrices that slabsim divides by, 1 + Y and 1 - R R' of passive media, have a Hermitian part that
is not negative, and elimination in the given order is stable for those.
"""

from slabsim.engine.half_spaces import kernel
from slabsim.engine.lanes import fill, fma, load, store, where_positive

ELEMENT = 16  # floats of one element: eight real, eight imaginary parts


@kernel
def clear(b, x, size):
    """Zeros in `size` elements from x on."""
    for k in range(2 * size):
        store(b, x + 8 * k, fill(0.0))


@kernel
def copy(b, size, x, out):
    """`size` elements from x to out."""
    for k in range(2 * size):
        store(b, out + 8 * k, load(b, x + 8 * k))


@kernel
def add_to_diagonal(b, n, x, value):
    """x <- x + value 1."""
    for i in range(n):
        at = x + ELEMENT * i * (n + 1)
        store(b, at, load(b, at) + fill(value))


@kernel
def multiply(b, n, inner, m, x, y, out, keep):
    """out <- x y, or out + x y where `keep`; x is n by inner, y is inner by m. `out` is none of the two."""
    for i in range(n):
        for j in range(m):
            at = out + ELEMENT * (i * m + j)
            rr, ii, ri, ir = fill(0.0), fill(0.0), fill(0.0), fill(0.0)
            for k in range(inner):
                p, q = x + ELEMENT * (i * inner + k), y + ELEMENT * (k * m + j)
                ar, ai, br, bi = load(b, p), load(b, p + 8), load(b, q), load(b, q + 8)
                rr, ii = fma(ar, br, rr), fma(ai, bi, ii)
                ri, ir = fma(ar, bi, ri), fma(ai, br, ir)
            re, im = rr - ii, ri + ir
            if keep:
                re, im = re + load(b, at), im + load(b, at + 8)
            store(b, at, re)
            store(b, at + 8, im)


@kernel
def one_minus_product(b, n, x, y, out):
    """out <- 1 - x y."""
    multiply(b, n, n, n, x, y, out, False)
    for k in range(2 * n * n):
        store(b, out + 8 * k, fill(0.0) - load(b, out + 8 * k))
    add_to_diagonal(b, n, out, 1.0)


@kernel
def divide(b, n, m, x, y):
    """y <- x^-1 y, with y n by m; x is used up. A vanishing pivot counts as infinite: what it drives is not driven."""
    for k in range(n):
        at = x + ELEMENT * k * (n + 1)
        re, im = load(b, at), load(b, at + 8)
        size = fma(re, re, im * im)
        inverse = fill(1.0) / where_positive(size, size, fill(1e300))
        pr, pi = re * inverse, fill(0.0) - im * inverse
        for j in range(k + 1, n):
            _scale(b, x + ELEMENT * (k * n + j), pr, pi)
        for j in range(m):
            _scale(b, y + ELEMENT * (k * m + j), pr, pi)
        for i in range(n):
            if i != k:
                at = x + ELEMENT * (i * n + k)
                fr, fi = load(b, at), load(b, at + 8)
                for j in range(k + 1, n):
                    _eliminate(b, x + ELEMENT * (k * n + j), x + ELEMENT * (i * n + j), fr, fi)
                for j in range(m):
                    _eliminate(b, y + ELEMENT * (k * m + j), y + ELEMENT * (i * m + j), fr, fi)


@kernel
def _scale(b, at, pr, pi):
    re, im = load(b, at), load(b, at + 8)
    store(b, at, re * pr - im * pi)
    store(b, at + 8, fma(re, pi, im * pr))


@kernel
def _eliminate(b, source, target, fr, fi):
    re, im = load(b, source), load(b, source + 8)
    store(b, target, load(b, target) - fr * re + fi * im)
    store(b, target + 8, load(b, target + 8) - fr * im - fi * re)
