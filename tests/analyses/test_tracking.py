from slabsim.analyses.passbands import Band, BandList
from slabsim.analyses.tracking import follow_bands, pair_bands


def band(lower, upper):
    """A band of which only the edges matter."""
    return Band(lower, upper, False, False, 1.0, 0.5 * (lower + upper), 0.0, float("nan"))


def at(angle_deg, *bands):
    """The bands at one angle."""
    return BandList("TM", angle_deg, "T", 0.5, 0.05, 1.0, bands)


def test_bands_pair_by_overlap_and_leave_strangers_alone():
    a, b, c, d = band(1, 2), band(5, 6), band(1.2, 2.1), band(20, 21)
    assert pair_bands([a, b], [c, d]) == [(a, c), (b, None), (None, d)]


def test_a_wide_band_pairs_with_its_wide_remainder_and_not_with_a_splinter():
    whole, rest, splinter = band(10, 40), band(10, 37), band(38.1, 38.2)
    assert pair_bands([whole], [rest, splinter]) == [(whole, rest), (None, splinter)]


def test_bands_that_no_longer_overlap_pair_within_the_width_of_the_wider():
    a, b = band(10, 11), band(11.2, 11.6)
    assert pair_bands([a], [b]) == [(a, b)]


def test_tracks_follow_a_shift_and_start_and_end_where_bands_appear_and_vanish():
    lists = [at(0, band(1, 2), band(5, 6)), at(10, band(1.1, 2.1)), at(20, band(1.2, 2.2), band(9, 10))]
    tracks = follow_bands(lists)
    assert [track.angles_deg for track in tracks] == [(0, 10, 20), (0,), (20,)]
    assert [one.lower for one in tracks[0].bands] == [1, 1.1, 1.2]
