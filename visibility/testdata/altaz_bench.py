"""Altitude and azimuth of the same grid by astropy's vectorised AltAz.
Arguments and output as in atioq_bench.c. A ninth argument `cells` transforms
a table of cells, each with its own instant, instead of a grid in which a
field's coordinates and a slot's instant are broadcast against each other."""
import sys
import time
import warnings

import astropy.units as u
import numpy as np
from astropy.coordinates import AltAz, EarthLocation, SkyCoord
from astropy.time import Time
from astropy.utils import iers

warnings.simplefilter("ignore")
iers.conf.auto_download = False
iers.conf.iers_degraded_accuracy = "ignore"

fields, slots = int(sys.argv[1]), int(sys.argv[2])
start, step, lat, lon, elev = map(float, sys.argv[3:8])
i = np.arange(fields)
ra = np.fmod(i * np.pi * (3 - np.sqrt(5)), 2 * np.pi)
dec = np.arcsin(1 - (2 * i + 1) / fields)
shape = (1, slots)
if len(sys.argv) > 9 and sys.argv[9] == "cells":
    ra, dec, shape = np.repeat(ra, slots), np.repeat(dec, slots), (fields * slots, 1)
sky = SkyCoord(ra[:, None] * u.rad, dec[:, None] * u.rad)
place = EarthLocation.from_geodetic(lon * u.rad, lat * u.rad, elev * u.m)
best = 0.0
for _ in range(int(sys.argv[8])):
    when = Time(start + step * np.resize(np.arange(slots), shape), format="unix")
    when.delta_ut1_utc = np.zeros(shape)
    t = time.perf_counter()
    here = sky.transform_to(AltAz(obstime=when, location=place))
    alt, az = here.alt.rad, here.az.rad
    best = max(best, fields * slots / (time.perf_counter() - t))
print("%.6g" % best)
for a, z in list(zip(alt.ravel(), az.ravel()))[::997]:
    print("%.12f %.12f" % (a, z))
