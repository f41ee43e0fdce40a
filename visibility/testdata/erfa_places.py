"""Reads lines `ra dec pmra pmdec lat lon elevation jd1 jd2 dut1` (rad, rad/yr
with cos dec, m, d, s) and prints east, north, up of the airless apparent
place, then galactic and ecliptic coordinates, by ERFA (IAU SOFA algorithms)."""
import sys

import erfa
import numpy as np

bias = erfa.ecm06(2451545.0, 0.0)
for line in sys.stdin:
    ra, dec, pmra, pmdec, lat, lon, elev, jd1, jd2, dut1 = map(float, line.split())
    az, zd, *_ = erfa.atco13(ra, dec, pmra / np.cos(dec), pmdec, 0.0, 0.0, jd1, jd2, dut1,
                             lon, lat, elev, 0.0, 0.0, 0.0, 0.0, 0.0, 0.55)
    up = np.cos(zd)
    l, b = erfa.icrs2g(ra, dec)
    el, eb = erfa.c2s(bias @ erfa.s2c(ra, dec))
    print(*(repr(float(x)) for x in (np.sin(zd) * np.sin(az), np.sin(zd) * np.cos(az), up, l, b, el, eb)))
