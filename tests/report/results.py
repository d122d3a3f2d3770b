"""Made-up results to print and draw."""

from slabsim.analyses.passbands import Band, BandList
from slabsim.analyses.tracking import Track


def band(lower, upper, cut_below=False, cut_above=False, peak=0.9, shape=1.5):
    """A band with its peak in the middle."""
    return Band(lower, upper, cut_below, cut_above, peak, 0.5 * (lower + upper), 0.25, shape)


def band_list(*bands, polarization="TM", angle_deg=30.0, quantity="T", peak=0.9):
    """Bands at one angle, at half the peak."""
    return BandList(polarization, angle_deg, quantity, 0.5 * peak, 0.05 * peak, peak, bands)


def track(*bands):
    """A band at 0, 10, 20 ... degrees."""
    return Track(tuple(10.0 * number for number in range(len(bands))), bands)
