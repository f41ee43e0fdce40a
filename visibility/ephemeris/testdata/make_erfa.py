"""Writes erfa.csv: values of the IAU's algorithms as python3-erfa computes them.

Command: /usr/bin/python3 make_erfa.py > erfa.csv
"""
import erfa
import numpy as np

J2000 = 2451545.0
rng = np.random.default_rng(20150101)
days = np.round(np.sort(np.concatenate([rng.uniform(15, 45, 100), [0.0, -28, -10, 5, 10, 60]]) * 365.25), 6)

cols = ['tt_days']
cols += ['dpsi_b_arcsec', 'deps_b_arcsec', 'dpsi_a_arcsec', 'deps_a_arcsec', 'obliquity_arcsec']
cols += ['c2i%d%d' % (i, j) for i in range(3) for j in range(3)]
cols += ['npb%d%d' % (i, j) for i in range(3) for j in range(3)]
cols += ['ecl%d%d' % (i, j) for i in range(3) for j in range(3)]
cols += ['s_arcsec', 'eo_arcsec', 'era_deg', 'gmst_deg', 'gast_deg']
cols += ['sun_%s_au' % a for a in 'xyz'] + ['vel_%s_c' % a for a in 'xyz'] + ['moon_%s_km' % a for a in 'xyz']

AS = 180 * 3600 / np.pi
print('# Source: ERFA %s through python3-erfa: nut00b (adjusted to IAU 2006 as nut06a does), nut06a, obl06,' % erfa.__version__)
print('# c2i06a, pnm06a, ecm06, s06, eors, era00, gmst06, gst06a (UT1 taken equal to TT), epv00, moon98.')
print('# Written by: /usr/bin/python3 make_erfa.py > erfa.csv; tt_days since 2000-01-01 12:00 TT.')
print(','.join(cols))
for d in days:
    t = d / 36525
    j2 = -2.7774e-6 * t
    dpsi, deps = erfa.nut00b(J2000, d)
    a = erfa.nut06a(J2000, d)
    npb = erfa.pnm06a(J2000, d)
    x, y = erfa.bpn2xy(npb)
    s = erfa.s06(J2000, d, x, y)
    helio, bary = erfa.epv00(J2000, d)
    row = [d, dpsi * (1 + 0.4697e-6 + j2) * AS, deps * (1 + j2) * AS, a[0] * AS, a[1] * AS, erfa.obl06(J2000, d) * AS]
    row += list(erfa.c2i06a(J2000, d).ravel()) + list(npb.ravel()) + list(erfa.ecm06(J2000, d).ravel())
    row += [s * AS, erfa.eors(npb, s) * AS]
    row += [np.degrees(f) for f in (erfa.era00(J2000, d), erfa.gmst06(J2000, d, J2000, d), erfa.gst06a(J2000, d, J2000, d))]
    row += list(-helio['p']) + list(bary['v'] / (299792.458 * 86400 / 149597870.7))
    row += list(erfa.moon98(J2000, d)['p'] * 149597870.7)
    print(','.join('%.14g' % v for v in row))
