#!/usr/bin/env python3
"""Writes vacuum_reference.csv: delay and rapidity of three invented pairs, by a model independent of the crate.

Independent in its propagator (the C++ code behind the Python package sgp4), its precision (mpmath, 40 digits from
the propagator's positions on), its way (fixed-point light time and numerical phase in place of slopes solved by
hand) and its author's formulas: received/transmitted is the derivative of the phase sent by the phase received.
Needs: sgp4 2.27, mpmath. Run: python3 vacuum_reference.py > vacuum_reference.csv
"""
from mpmath import mp, mpf, cos, sin, sqrt, log, pi
from sgp4.api import Satrec, WGS72

mp.dps = 40
C = mpf(299792458)
GM, J2, A = mpf("3.986004418e14"), mpf("1.0826267e-3"), mpf(6378137)
LG = mpf("6.969290134e-10")
# Elements (all of epoch 2026-06-01T12:00), site, hours from the element epoch to the reference epoch, first time and
# step in seconds from the reference epoch, count of times.
TOP = "1 %sU 26001A   26152.50000000  .00000000  00000-0  10000-4 0  999%d"
CASES = {
    "synthetic": (
        (TOP % (90001, 5), "2 90001  97.6000 255.0000 0010000  90.0000   0.0000 15.05491974    12"),
        ("45", "7.5", "300"), 0, 340, 10, 75,
    ),
    "eccentric": (
        (TOP % (90002, 6), "2 90002  63.4000 300.0000 7000000 270.0000  10.0000  2.00600000    15"),
        ("-33.9", "-70.4", "2400"), 36, 0, 1800, 12,
    ),
    "retrograde": (
        (TOP % (90003, 7), "2 90003 120.0000  10.0000 0200000 270.0000   0.0000 15.50000000    11"),
        ("0", "-78", "0"), 100, -500, 400, 12,
    ),
}



def teme(t):
    """Position at t s from the reference, m; the propagator takes f64 minutes."""
    t += HOURS * 3600
    error, r, v = satellite.sgp4_tsince(float(t / 60))
    assert error == 0
    rest = t - mpf(float(t / 60)) * 60  # what the f64 minutes lost, put back with the velocity
    return [mpf(x) * 1000 + mpf(w) * 1000 * rest for x, w in zip(r, v)], [mpf(w) * 1000 for w in v]


def gmst(t):
    ut1 = mpf(9648 * 86400) + HOURS * 3600 + t  # from 2000-01-01T12:00 over 2026-06-01T12:00
    T = ut1 / (36525 * 86400)
    s = mpf("24110.54841") - 43200 + (mpf("8640184.812866") + (mpf("0.093104") - mpf("6.2e-6") * T) * T) * T + ut1
    return s * 2 * pi / 86400


def ground(t):
    f = 1 / mpf("298.257223563")
    e2 = f * (2 - f)
    lat, lon, h = mpf(SITE[0]) * pi / 180, mpf(SITE[1]) * pi / 180, mpf(SITE[2])
    n = A / sqrt(1 - e2 * sin(lat) ** 2)
    x, z = (n + h) * cos(lat), (n * (1 - e2) + h) * sin(lat)
    return [x * cos(lon + gmst(t)), x * sin(lon + gmst(t)), z]


def distance(a, b):
    return sqrt(sum((x - y) ** 2 for x, y in zip(a, b)))


def solve(function):
    tau = mpf(0)
    for _ in range(9):
        tau = function(tau) / C
    return tau


def clock_rate(s):
    r, v = teme(s)
    radius = distance(r, [0, 0, 0])
    u = GM / radius * (1 - J2 * (A / radius) ** 2 * (3 * (r[2] / radius) ** 2 - 1) / 2)
    return LG - (sum(w * w for w in v) / 2 + u) / C**2 - mpf("9.80665") * mpf(SITE[2]) / C**2


GRID = 20


def clock_gain(s):
    """Integral of clock_rate from 0: Simpson's rule on a 20 s grid with a last short panel."""
    def simpson(a, b):
        return (b - a) / 6 * (clock_rate(a) + 4 * clock_rate((a + b) / 2) + clock_rate(b))
    k = int(s // GRID)
    for i in range(k):
        if i + 1 not in _y:
            _y[i + 1] = _y[i] + simpson(mpf(i * GRID), mpf((i + 1) * GRID))
    for i in range(0, k, -1):
        if i - 1 not in _y:
            _y[i - 1] = _y[i] - simpson(mpf((i - 1) * GRID), mpf(i * GRID))
    return _y[k] + simpson(mpf(k * GRID), s)


def delay(direction, t):
    if direction == "down":
        tau = solve(lambda tau: distance(teme(t - tau)[0], ground(t)))
        return tau - clock_gain(t - tau)
    if direction == "up":
        tau = solve(lambda tau: distance(teme(t + tau)[0], ground(t)))
        return tau + clock_gain(t + tau)
    down = solve(lambda tau: distance(teme(t - tau)[0], ground(t)))
    s = t - down
    r = teme(s)[0]
    return down + solve(lambda tau: distance(r, ground(s - tau)))


def slope(direction, t):
    """Eighth-order central difference."""
    h = mpf(1) / 2
    d = [delay(direction, t + k * h) - delay(direction, t - k * h) for k in (1, 2, 3, 4)]
    return (mpf(4) / 5 * d[0] - d[1] / 5 + mpf(4) / 105 * d[2] - d[3] / 280) / h


print("case,direction,t_s,delay_s,rapidity")
for name, (lines, SITE, HOURS, first, step, count) in CASES.items():
    satellite = Satrec.twoline2rv(*lines, WGS72)
    _y = {0: mpf(0)}
    times = [mpf(first + step * k) for k in range(count)] + ([mpf("715.41522")] if name == "synthetic" else [])
    for direction in ("down", "up", "two-way"):
        for t in times:
            x = slope(direction, t)
            rapidity = -log(1 + x) if direction == "up" else log(1 - x)
            print(f"{name},{direction},{mp.nstr(t, 10)},{mp.nstr(delay(direction, t), 18)},{mp.nstr(rapidity, 15)}")
