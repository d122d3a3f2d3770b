"""What are r and t of a stack?

Conventions, stated once for all of slabsim
    Time factor exp(-i w t): passive media have Im(eps) >= 0 and Im(mu) >= 0.
    z runs from the front half-space, where the wave comes from, to the back; all fields vary as exp(i kx x + i ky y),
    (kx, ky) = k0 n_front sin(theta) (cos phi, sin phi), phi the azimuth of the plane of incidence from x.
    s = (-sin phi, cos phi, 0). TE: electric field along s. TM: magnetic field along s.
    r, t are ratios of electric-field amplitudes; r_TM has the sign of the ratio of the magnetic fields, so that
    r_TM = -r_TE at normal incidence on an isotropic stack. r refers to the front face, t to the back face.
    R, T are ratios of power flux through the faces; A = 1 - R - T, over all that one incident wave sends out.
    TE_to_TM is a TE wave that leaves as TM: cross terms are named by what comes in, then by what goes out.

The way of a number
    stack/ and materials/ -> pack.py (frequency-only quantities, plain arrays) -> kernels.py (points only)
    -> response.py (r, t, R, T, A), for stacks whose polarizations stay apart; for all others
    -> generators.py, port_pack.py -> ports.py -> response.py; and for all -> fields.py (power lost in each layer).
"""
