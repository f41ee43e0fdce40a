"""Writes de405.csv: geocentric Sun and Moon and the Earth's barycentric velocity
of the JPL ephemeris DE405, read from the Debian package casacore-data-jpl-de405.

Command: /usr/bin/python3 make_de405.py > de405.csv
"""
from casacore.tables import table
import numpy as np

_t = table('/usr/share/casacore/data/ephemerides/DE405', ack=False)
_x = _t.getcol('x')
_start = _t.getcol('MJD')+2400000.5
# 1-based offset in JPL's record (the table lacks its first two numbers),
# coefficients per component, subintervals of the record of 32 d
LAYOUT = {'emb': (231, 13, 2), 'moon': (441, 13, 8), 'sun': (753, 11, 2)}
EMRAT = 81.30056


def state(body, jd):
    """km and km/d for an array of jd (TDB)."""
    o, n, m = LAYOUT[body]
    r = np.clip(np.searchsorted(_start, jd, side='right')-1, 0, len(_start)-1)
    tau = (jd-_start[r])/32*m
    k = np.minimum(tau.astype(int), m-1)
    u = 2*(tau-k)-1
    out = np.zeros((len(jd), 6))
    for i in range(3):
        c = np.array([_x[a, o-3+b*3*n+i*n:o-3+b*3*n+i*n+n] for a, b in zip(r, k)]).T
        T = [np.ones_like(u), u]
        D = [np.zeros_like(u), np.ones_like(u)]
        for j in range(2, n):
            T.append(2*u*T[-1]-T[-2])
            D.append(2*T[j-1]+2*u*D[-1]-D[-2])
        out[:, i] = (c*np.array(T)).sum(0)
        out[:, 3+i] = (c*np.array(D)).sum(0)*2*m/32
    return out


def earth(jd):
    return state('emb', jd)-state('moon', jd)/(1+EMRAT)


if __name__ == '__main__':
    rng = np.random.default_rng(405)
    days = np.round(np.sort(np.concatenate([rng.uniform(15, 45, 500), rng.uniform(-28, 15, 60), rng.uniform(45, 60, 40)]) * 365.25), 6)
    jd = 2451545.0 + days
    home = earth(jd)
    sun = (state('sun', jd) - home)[:, :3] / 149597870.7
    vel = home[:, 3:] / (299792.458 * 86400)
    moon = state('moon', jd)[:, :3]
    print('# Source: JPL DE405 (Standish 1998) as in the Debian package casacore-data-jpl-de405.')
    print('# Written by: /usr/bin/python3 make_de405.py > de405.csv; tdb_days since 2000-01-01 12:00 TDB; axes ICRF.')
    print('tdb_days,sun_x_au,sun_y_au,sun_z_au,vel_x_c,vel_y_c,vel_z_c,moon_x_km,moon_y_km,moon_z_km')
    for row in zip(days, *sun.T, *vel.T, *moon.T):
        print(','.join('%.12g' % v for v in row))
