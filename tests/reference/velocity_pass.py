"""Range rate of the synthetic pass that the velocity filter is tested on, as Chebyshev series.

Element set, site and frames: the project's check values, section 3 (geometric: no light time,
UT1 = UTC, no polar motion; WGS-72 SGP4 with its own velocity). Needs numpy and sgp4 2.27 or later.
Writes velocity_pass.csv: per row the start of a segment in seconds after 2026-06-01T12:00:00 UTC,
its length, and the coefficients of T_0, T_1, ... in m/s. Run: python velocity_pass.py > velocity_pass.csv
"""

from math import cos, pi, sin

import numpy as np
from numpy.polynomial import chebyshev
from sgp4.api import WGS72, Satrec, jday

LINES = (
    "1 90001U 26001A   26152.50000000  .00000000  00000-0  10000-4 0  9995",
    "2 90001  97.6000 255.0000 0010000  90.0000   0.0000 15.05491974    12",
)
SITE = np.array([4479.15257984, 589.69162421, 4487.5605409])  # km, Earth-fixed
EARTH_RATE = 7.29211514670698e-05  # rad/s, consistent with the 1982 sidereal time
START, STOP, LENGTH, DEGREE = 350.0, 1080.0, 36.5, 11

satellite = Satrec.twoline2rv(*LINES, WGS72)


def sidereal_angle(day, fraction):
    """Greenwich mean sidereal time of 1982, rad."""
    t = ((day - 2451545.0) + fraction) / 36525.0
    s = 67310.54841 + (876600 * 3600 + 8640184.812866) * t + 0.093104 * t * t - 6.2e-6 * t**3
    return (s % 86400.0) / 240.0 * pi / 180.0


def range_rate(seconds):
    """Range rate, m/s, positive = receding."""
    day, fraction = jday(2026, 6, 1, 12, 0, 0.0)
    fraction += seconds / 86400.0
    error, r, v = satellite.sgp4(day, fraction)
    assert error == 0
    angle = sidereal_angle(day, fraction)
    c, s = cos(angle), sin(angle)
    turn = np.array([[c, s, 0.0], [-s, c, 0.0], [0.0, 0.0, 1.0]])
    position = turn @ np.array(r)
    velocity = turn @ np.array(v) - np.cross([0.0, 0.0, EARTH_RATE], position)
    line = position - SITE
    return 1000.0 * (line @ velocity) / np.linalg.norm(line)


for start in np.arange(START, STOP, LENGTH):
    series = chebyshev.chebinterpolate(
        lambda x: np.array([range_rate(start + LENGTH * (y + 1) / 2) for y in x]), DEGREE
    )
    dense = np.linspace(-1, 1, 101)
    exact = np.array([range_rate(start + LENGTH * (y + 1) / 2) for y in dense])
    assert np.abs(chebyshev.chebval(dense, series) - exact).max() < 2e-5
    print(",".join([f"{start}", f"{LENGTH}"] + [f"{value:.8f}" for value in series]))
