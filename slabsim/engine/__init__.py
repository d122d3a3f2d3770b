"""What are r and t of a stack?

Conventions, stated once for all of slabsim
    Time factor exp(-i w t): passive media have Im(eps) >= 0 and Im(mu) >= 0.
    z runs from the front half-space, where the wave comes from, to the back; all fields vary as exp(i kx x).
    TE: electric field along y. TM: magnetic field along y.
    r, t are ratios of electric-field amplitudes; r_TM has the sign of the ratio of the magnetic fields, so that
    r_TM = -r_TE at normal incidence on an isotropic stack. r refers to the front face, t to the back face.
    R, T are ratios of power flux through the faces; A = 1 - R - T.

The way of a number
    stack/ and materials/ -> pack.py (frequency-only quantities, plain arrays) -> kernels.py (points only)
    -> response.py (r, t, R, T, A) and fields.py (power lost in each layer).
"""
