"""Where stars, Sun and Moon stand, and how bright the sky is: for the outside
check of a plan's visits. Written from the published formulas over ERFA, with
no code of the program. Arrays throughout; radians and Unix seconds (UTC).
"""

import erfa
import numpy as np

AU_KM = erfa.DAU / 1000
LIGHT_KM_S = erfa.CMPS / 1000


def utc(unix):
    """Unix seconds as ERFA's two-part quasi JD."""
    day = np.floor(unix / 86400)
    return 2440587.5 + day, (unix - day * 86400) / 86400


def airless(unix, site, dut1):
    """ERFA's star-independent parameters for an observer, without air and
    without polar motion. site is (latitude, longitude, height)."""
    a, b = utc(unix)
    lat, lon, height = site
    astrom, _ = erfa.apco13(a, b, dut1, lon, lat, height, 0, 0, 0, 0, 0, 0.5)
    return astrom


def observed(cirs, astrom):
    """A unit vector in the intermediate frame as altitude, azimuth, hour
    angle, declination."""
    ra, dec = erfa.c2s(cirs)
    az, zd, ha, dec, _ = erfa.atioq(ra, dec, astrom)
    return np.pi / 2 - zd, az, ha, dec


def star(unix, site, dut1, ra, dec, pm_ra, pm_dec):
    """A star's place; pm_ra with cos dec, both in rad a year."""
    astrom = airless(unix, site, dut1)
    # atciq takes dRA/dt.
    ri, di = erfa.atciq(ra, dec, pm_ra / np.cos(dec), pm_dec, 0, 0, astrom)
    az, zd, ha, dec, _ = erfa.atioq(ri, di, astrom)
    return np.pi / 2 - zd, az, ha, dec


def unit(v):
    return v / np.linalg.norm(v, axis=-1, keepdims=True)


def apparent(v, astrom):
    """A geometric direction from the observer as an apparent one in the
    intermediate frame: aberration, then bias-precession-nutation."""
    p = erfa.ab(unit(v), astrom["v"], astrom["em"], astrom["bm1"])
    return np.einsum("...ij,...j->...i", astrom["bpn"], p)


def earth(unix):
    """Heliocentric and barycentric position and velocity of the Earth, and TT."""
    a, b = utc(unix)
    t1, t2 = erfa.taitt(*erfa.utctai(a, b))
    pvh, pvb = erfa.epv00(t1, t2)
    return pvh, pvb, (t1, t2)


def sun(unix, site, dut1):
    """The Sun's altitude, azimuth, hour angle, and its vector from the
    observer in au (GCRS axes)."""
    astrom = airless(unix, site, dut1)
    pvh, pvb, _ = earth(unix)
    v = pvb["p"] - pvh["p"] - astrom["eb"]
    alt, az, ha, _ = observed(apparent(v, astrom), astrom)
    return alt, az, ha, v


def moon(unix, site, dut1):
    """The Moon's altitude and azimuth, and its vector from the observer in au.
    erfa.moon98: Meeus, Astronomical Algorithms (1998), ch. 47."""
    astrom = airless(unix, site, dut1)
    _, pvb, (t1, t2) = earth(unix)
    here = astrom["eb"] - pvb["p"]  # from the geocentre
    tau = np.zeros_like(np.asarray(unix, float))
    for _ in range(3):
        geo = erfa.moon98(t1, t2 - tau / 86400)["p"]
        # The Earth has carried the geocentre on since the light left.
        v = geo - pvb["v"] * (tau / 86400)[..., None] - here
        tau = np.linalg.norm(v, axis=-1) * AU_KM / LIGHT_KM_S
    alt, az, _, _ = observed(apparent(v, astrom), astrom)
    return alt, az, v


def direction(alt, az):
    c = np.cos(alt)
    return np.stack([c * np.sin(az), c * np.cos(az), np.sin(alt)], axis=-1)


def separation(alt1, az1, alt2, az2):
    return erfa.sepp(direction(alt1, az1), direction(alt2, az2))


def phase_angle(moon_vec, sun_vec):
    """At the Moon, between observer and Sun."""
    return erfa.sepp(-moon_vec, sun_vec - moon_vec)


def airmass(alt):
    """Young (1994), Appl. Opt. 33, 1108, of the airless altitude."""
    c = np.sin(alt)
    return (1.002432 * c**2 + 0.148386 * c + 0.0096467) / (
        c**3 + 0.149864 * c**2 + 0.0102963 * c + 0.000303978
    )


# Patat et al. (2006), A&A 455, 385, table 1: twilight at the zenith; and the
# dark zenith sky of Patat (2003), A&A 400, 1183, table 4.
TWILIGHT = {
    "U": (11.78, 1.376, -0.039, 22.3),
    "B": (11.84, 1.411, -0.041, 22.6),
    "V": (11.84, 1.518, -0.057, 21.6),
    "R": (11.40, 1.567, -0.064, 20.9),
    "I": (10.93, 1.470, -0.062, 19.7),
}


def ks_path(zd):
    """Krisciunas & Schaefer (1991), PASP 103, 1033, eq. 3."""
    return 1 / np.sqrt(1 - 0.96 * np.sin(zd) ** 2)


def sky_flux(f, alt, sun_alt, moon_alt, sep, phase):
    """The sky at the field in a filter, 10^(-0.4 mag/arcsec2)."""
    k = f["extinction"]
    x = ks_path(np.pi / 2 - alt)
    # Garstang (1989) as in Patat (2003), appendix C, f = 0.6.
    dark = 10 ** (-0.4 * f["dark_sky"]) * (0.4 + 0.6 * x) * 10 ** (-0.4 * k * (x - 1))
    # Krisciunas & Schaefer eq. 15, 20, 21, and 19 within 10 deg.
    a, rho = np.degrees(phase), np.maximum(np.degrees(sep), 0.25)
    istar = 10 ** (-0.4 * (3.84 + 0.026 * a + 4e-9 * a**4))
    frho = 10**5.36 * (1.06 + np.cos(sep) ** 2)
    frho += np.where(rho < 10, 6.2e7 / rho**2, 10 ** (6.15 - rho / 40))
    xm = ks_path(np.pi / 2 - moon_alt)
    nl = frho * istar * 10 ** (-0.4 * k * xm) * (1 - 10 ** (-0.4 * k * x))
    # Eq. 1 backwards: nanolamberts to V, to flux.
    to_flux = 10 ** (-0.4 * 20) / (34.08 * np.exp(20.7233 - 0.92104 * 20))
    moonlight = np.where(moon_alt > 0, f.get("moonlight", 1) * nl * to_flux, 0)
    a0, a1, a2, published = TWILIGHT[f["band"].upper()]
    zeta = 90 - np.degrees(sun_alt)
    d = np.clip(zeta, 95, 105) - 95
    twilight = 10 ** (-0.4 * (a0 + a1 * d + a2 * d**2)) - 10 ** (-0.4 * published)
    twilight = np.maximum(twilight, 0) * np.clip(106 - zeta, 0, 1)
    return dark + moonlight + twilight


def quality(f, alt, flux):
    """0 at and below the horizon."""
    up = alt > 0
    x = airmass(np.where(up, alt, np.pi / 2))
    q = 10 ** (-0.8 * f["extinction"] * (x - 1)) * x**-1.2
    return np.where(up, np.minimum(1, q * 10 ** (-0.4 * f["dark_sky"]) / flux), 0)
