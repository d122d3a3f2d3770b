"""Which pass band here is which pass band there: between two models, and from angle to angle."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

from slabsim.analyses.passbands import Band, BandList


@dataclass(frozen=True)
class Track:
    """One pass band followed over the angles of one polarization.

    Attributes
    ----------
    angles_deg : tuple of float
        Ascending; the angles at which the band was found [degrees].
    bands : tuple of Band
        One per angle.
    """

    angles_deg: tuple[float, ...]
    bands: tuple[Band, ...]


def pair_bands(first: Sequence[Band], second: Sequence[Band]) -> list[tuple[Band | None, Band | None]]:
    """Pairs of bands that are the same band, in ascending order; None where a band has no partner.

    Bands that overlap most go together first; then neighbours whose centres lie closer than the wider one is wide.
    """
    scored = sorted(((_closeness(a, b), i, j) for i, a in enumerate(first) for j, b in enumerate(second)), reverse=True)
    partner: dict[int, int] = {}
    for closeness, i, j in scored:
        if closeness > -1.0 and i not in partner and j not in partner.values():
            partner[i] = j
    pairs: list[tuple[Band | None, Band | None]] = [
        (band, second[partner[i]] if i in partner else None) for i, band in enumerate(first)
    ]
    pairs += [(None, band) for j, band in enumerate(second) if j not in partner.values()]
    return sorted(pairs, key=lambda pair: next(band.centre for band in pair if band is not None))


def follow_bands(lists: Sequence[BandList]) -> list[Track]:
    """Bands of one polarization followed from angle to angle, `lists` in ascending order of angle."""
    tracks: list[list[tuple[float, Band]]] = []
    open_tracks: list[list[tuple[float, Band]]] = []
    for found in lists:
        pairs = pair_bands([track[-1][1] for track in open_tracks], found.bands)
        ends = {id(track[-1][1]): track for track in open_tracks}
        open_tracks = []
        for before, here in pairs:
            if here is None:
                continue
            track = ends[id(before)] if before is not None else []
            if before is None:
                tracks.append(track)
            track.append((found.angle_deg, here))
            open_tracks.append(track)
    return [Track(tuple(a for a, _ in track), tuple(b for _, b in track)) for track in tracks]


def _closeness(a: Band, b: Band) -> float:
    """Overlap, or minus the distance of the centres where there is none, over the wider width."""
    overlap = min(a.upper, b.upper) - max(a.lower, b.lower)
    return (overlap if overlap > 0.0 else -abs(a.centre - b.centre)) / max(a.width, b.width, 1e-300)
