#!/usr/bin/python3
"""Recomputes the visits of a plan from outside: over ERFA, with no code of
the program.

    check_visits.py SURVEY VISITS.csv

SURVEY is a survey folder or file; VISITS.csv is what
`nightwright export PLAN --as csv` writes. It prints the worst difference of
each quantity with what is tolerated, and exits 1 when one is over, or when a
rule, a gap, a set or a spacing doesn't hold. README.md beside it names the
sources and says what is tolerated and why.
"""

import collections
import csv
import datetime
import sys
import warnings

import numpy as np

import sky
from survey import Survey, exposures, seconds

DEG = np.pi / 180
ARCSEC = DEG / 3600

# quantity: (tolerance, unit, factor to that unit)
TOLERATED = {
    "altitude": (0.01, "arcsec", 1 / ARCSEC),
    "azimuth on the sky": (0.01, "arcsec", 1 / ARCSEC),
    "airmass": (1e-7, "of it", 1),
    "sun altitude": (0.1, "arcsec", 1 / ARCSEC),
    "moon altitude": (0.1, "arcsec", 1 / ARCSEC),
    "moon separation": (0.1, "arcsec", 1 / ARCSEC),
    "sky": (1e-4, "mag/arcsec2", 1),
    "quality": (1e-4, "of it", 1),
    "credit": (1e-4, "of it", 1),
    "exposure length": (2e-6, "s", 1),
    "needed gap": (1e-3, "s", 1),
}
# How far a limit may be passed: the tolerances above, and a rounding of time.
SLACK = {"field": 0.01 * ARCSEC, "sun": 0.1 * ARCSEC, "moon": 0.1 * ARCSEC, "time": 1e-5}


class Judge:
    def __init__(self):
        self.worst = dict.fromkeys(TOLERATED, 0.0)
        self.faults = []

    def compare(self, name, a, b):
        d = np.abs(np.asarray(a, float) - np.asarray(b, float)) * TOLERATED[name][2]
        self.worst[name] = max(self.worst[name], float(np.max(np.where(np.isnan(d), np.inf, d), initial=0)))

    def fault(self, text):
        self.faults.append(text)

    def report(self, rows, out):
        bad = len(self.faults)
        print(f"{'quantity':20} {'worst':>12} {'tolerated':>10}", file=out)
        for name, (limit, unit, _) in TOLERATED.items():
            over = not self.worst[name] <= limit
            bad += over
            print(f"{name:20} {self.worst[name]:12.3g} {limit:10.3g} {unit}{'  OVER' if over else ''}", file=out)
        for text in self.faults[:20]:
            print("fault:", text, file=out)
        print(f"{len(rows)} exposures, {len(self.faults)} faults", file=out)
        return bad


def instant(text):
    t = datetime.datetime.strptime(text if "." in text else text[:-1] + ".0Z", "%Y-%m-%dT%H:%M:%S.%fZ")
    return (t - datetime.datetime(1970, 1, 1)) / datetime.timedelta(microseconds=1) / 1e6


def read(path):
    with (sys.stdin if path == "-" else open(path, encoding="utf-8-sig", newline="")) as f:
        rows = list(csv.DictReader(f))
    if not rows:
        raise SystemExit("no visits to check")
    for r in rows:
        r["start"], r["end"] = instant(r["start_utc"]), instant(r["end_utc"])
    return sorted(rows, key=lambda r: (r["start"], r["telescope"]))


def column(rows, name):
    return np.array([float(r[name]) for r in rows])


def look(sv, site, rows, at):
    """All there is to know of rows of one site at instants."""
    f = [sv.fields[r["field"]] for r in rows]
    arr = lambda k: np.array([x[k] for x in f])  # noqa: E731
    alt, az, ha, dec = sky.star(at, site, sv.dut1, arr("ra"), arr("dec"), arr("pm_ra"), arr("pm_dec"))
    sun_alt, _, _, sun_vec = sky.sun(at, site, sv.dut1)
    moon_alt, moon_az, moon_vec = sky.moon(at, site, sv.dut1)
    return {
        "alt": alt, "az": az, "ha": ha, "dec": dec, "sun": sun_alt, "moon": moon_alt,
        "sep": sky.separation(alt, az, moon_alt, moon_az), "phase": sky.phase_angle(moon_vec, sun_vec),
    }


def check_numbers(j, sv, site, rows):
    start, end = column(rows, "start"), column(rows, "end")
    mid = look(sv, site, rows, (start + end) / 2)
    j.compare("altitude", mid["alt"], column(rows, "altitude_deg") * DEG)
    off = np.remainder(mid["az"] - column(rows, "azimuth_deg") * DEG + np.pi, 2 * np.pi) - np.pi
    j.compare("azimuth on the sky", off * np.cos(mid["alt"]), 0)
    j.compare("airmass", sky.airmass(mid["alt"]) / column(rows, "airmass"), 1)
    j.compare("sun altitude", mid["sun"], column(rows, "sun_altitude_deg") * DEG)
    j.compare("moon altitude", mid["moon"], column(rows, "moon_altitude_deg") * DEG)
    j.compare("moon separation", mid["sep"], column(rows, "moon_separation_deg") * DEG)
    q = np.zeros(len(rows))
    for name, f in sv.filters.items():
        m = np.array([r["filter"] == name for r in rows])
        if not m.any():
            continue
        x = {k: v[m] for k, v in mid.items()}
        flux = sky.sky_flux(f, x["alt"], x["sun"], x["moon"], x["sep"], x["phase"])
        # The sky jumps where the Moon passes the horizon, within its error.
        sure = np.abs(x["moon"]) > SLACK["moon"]
        published = column(rows, "sky_mag_arcsec2")[m]
        j.compare("sky", (-2.5 * np.log10(flux))[sure], published[sure])
        q[m] = sky.quality(f, x["alt"], flux)
        j.compare("quality", (q[m] / column(rows, "quality")[m])[sure], 1)
    for r, v in zip(rows, q):
        r["q"] = v
    ends = [look(sv, site, rows, start), mid, look(sv, site, rows, end)]
    check_rules(j, sv, rows, ends)
    for i, r in enumerate(rows):
        for k, e in zip(("from", "mid", "to"), ends):
            r[k] = {n: float(v[i]) for n, v in e.items()}


def check_rules(j, sv, rows, ends):
    """The rules at start, middle and end."""
    rules = [sv.rules_of(r["field"], r["demand"]) for r in rows]
    lim = lambda k: np.array([x[k] for x in rules])  # noqa: E731

    def hold(name, bad):
        for i in np.flatnonzero(bad):
            j.fault(f"visit {rows[i]['visit']}: {name}")

    for x in ends:
        hold("altitude_min_deg", x["alt"] < lim("altitude_min_deg") * DEG - SLACK["field"])
        hold("airmass_max", sky.airmass(x["alt"] + SLACK["field"]) > lim("airmass_max"))
        hold("hour_angle_max_h", np.abs(x["ha"]) > lim("hour_angle_max_h") * 15 * DEG + SLACK["field"])
        hold("sun_altitude_max_deg", x["sun"] > np.minimum(lim("sun_altitude_max_deg"), -5) * DEG + SLACK["sun"])
        up = x["moon"] > SLACK["moon"]
        hold("moon_separation_min_deg", up & (x["sep"] < lim("moon_separation_min_deg") * DEG - SLACK["moon"]))
        hold("moon_illumination_max", up & ((1 + np.cos(x["phase"])) / 2 > lim("moon_illumination_max") + 1e-6))
        scopes = [sv.telescopes[r["telescope"]].get("altitude_deg") or {} for r in rows]
        hold("the mount's lowest altitude", x["alt"] < np.array([s.get("min", 0) for s in scopes]) * DEG - SLACK["field"])
        hold("the mount's highest altitude", x["alt"] > np.array([s.get("max", 90) for s in scopes]) * DEG + SLACK["field"])
    hold("min_quality", np.array([r["q"] for r in rows]) < lim("min_quality") * (1 - 1e-4))


def transits(sv, site, days):
    """The Sun's upper transit nearest to local mean noon of days since 1970."""
    t = days * 86400.0 + 43200 - site[1] / (2 * np.pi) * 86400
    for _ in range(6):
        t = t - sky.sun(t, site, sv.dut1)[2] / (2 * np.pi) * 86400
    return t


def check_nights(j, sv, site, rows):
    day = np.array([(datetime.date.fromisoformat(r["night"]) - datetime.date(1970, 1, 1)).days for r in rows])
    known, back = np.unique(day, return_inverse=True)
    begin, over = transits(sv, site, known)[back], transits(sv, site, known + 1)[back]
    for r, a, b in zip(rows, begin, over):
        r["transit"] = a
        if r["start"] < a - 0.1 or r["end"] > b + 0.1:
            j.fault(f"visit {r['visit']}: it isn't within the night of {r['night']}")
        if not sv.first <= r["night"] <= sv.last:
            j.fault(f"visit {r['visit']}: {r['night']} is outside the period")


def axis(delta, rate, acc):
    """Least time from rest to rest: trapezoid, or triangle when short."""
    s = abs(delta)
    return 2 * np.sqrt(s / acc) if s <= rate * rate / acc else s / rate + rate / acc


def gap(t, a, b):
    """Least time between two exposures of a telescope."""
    rate, acc = t["slew"]["rate_deg_s"] * DEG, t["slew"]["acceleration_deg_s2"] * DEG
    p, q, flips = a["to"], b["from"], False
    if t["mount"] == "equatorial":
        moves = q["ha"] - p["ha"], q["dec"] - p["dec"]
        flips = "flip" in t and (a["from"]["ha"] < 0) != (b["from"]["ha"] < 0)
    else:
        turn = np.remainder(q["az"] - p["az"] + np.pi, 2 * np.pi) - np.pi
        if t.get("azimuth_range_deg"):
            low = t["azimuth_range_deg"]["from"] * DEG
            turn = np.remainder(q["az"] - low, 2 * np.pi) - np.remainder(p["az"] - low, 2 * np.pi)
        moves = turn, q["alt"] - p["alt"]
    slew = max(axis(m, rate, acc) for m in moves)
    if slew > 0 or flips:
        slew += seconds(t["slew"].get("settle", 0))
    need = max(seconds(t.get("readout", 0)), slew)
    change = seconds(t.get("filter_change", 0)) if a["filter"] != b["filter"] else 0
    need = max(need, change) if t.get("during_slew") else need + change
    return need + (seconds(t["flip"]["time"]) if flips else 0)


def check_gaps(j, sv, rows):
    last = {}
    for r in rows:
        t, p = sv.telescopes[r["telescope"]], last.get(r["telescope"])
        need = 0.0
        # A transit in the dark, which joins two nights, is left to the program's audit.
        if p and p["night"] == r["night"]:
            need = gap(t, p, r)
            if r["start"] - p["end"] < need - SLACK["time"]:
                j.fault(f"visit {r['visit']}: {r['start'] - p['end']:.4f} s after visit {p['visit']}; {need:.4f} s are needed")
        if p and r["start"] < p["end"]:
            j.fault(f"visit {r['visit']}: it overlaps visit {p['visit']}")
        j.compare("needed gap", need, float(r["gap_before_s"]))
        last[r["telescope"]] = r


def check_visits(j, sv, rows):
    """Sets, lengths, cadence, counts and credits."""
    if len({r["visit"] for r in rows}) != len(rows):
        j.fault("a visit id is there twice")
    visits = collections.defaultdict(list)
    for r in rows:
        visits[r["field"], r["demand"], r["set"] or "visit " + r["visit"]].append(r)
    total = sum(sv.weight(f) for f in sv.fields)
    got = collections.defaultdict(list)
    for (field, demand, key), shots in visits.items():
        d = sv.demands[sv.fields[field]["program"], demand]
        steps = exposures(d)
        if len(shots) != len(steps) or len({(r["telescope"], r["night"]) for r in shots}) != 1:
            j.fault(f"{field} {demand} set {key}: it isn't whole, of one telescope and night")
            continue
        for k, (r, (filt, length, after, tolerance)) in enumerate(zip(shots, steps)):
            scale = float(sv.telescopes[r["telescope"]].get("exposure_scale", 1))
            j.compare("exposure length", r["end"] - r["start"], length * scale)
            j.compare("exposure length", r["end"] - r["start"], float(r["exposure_s"]))
            if r["filter"] != filt:
                j.fault(f"visit {r['visit']}: its filter is {r['filter']}, not {filt}")
            if k and abs(r["start"] - shots[k - 1]["start"] - after) > tolerance + SLACK["time"]:
                j.fault(f"visit {r['visit']}: it isn't {after} s after the exposure before, within {tolerance} s")
            unit = sv.weight(field) / (sv.wanted(field) * (1 + sv.bonus) * total * len(steps))
            want, is_ = unit * r["q"], float(r["credit"])
            if want > 0 and abs(r["mid"]["moon"]) > SLACK["moon"]:
                j.compare("credit", is_ / want, 1)
            elif not want and is_:
                j.fault(f"visit {r['visit']}: it earns nothing, and its credit is {is_}")
        got[field, demand].append(shots)
    for (field, demand), list_ in got.items():
        d = sv.demands[sv.fields[field]["program"], demand]
        starts = np.array([s[0]["start"] for s in list_])
        least = seconds((d.get("gap") or {}).get("min", 0))
        if np.any(np.diff(starts) < least - SLACK["time"]):
            j.fault(f"{field} {demand}: two visits are {np.min(np.diff(starts)):.3f} s apart; gap.min is {least} s")
        if len(starts) > int(d["visits"]):
            j.fault(f"{field} {demand}: {len(starts)} visits of {d['visits']}")
        most = collections.Counter(s[0]["night"] for s in list_).most_common(1)[0][1]
        if d.get("per_night") and most > int(d["per_night"]):
            j.fault(f"{field} {demand}: {most} visits in one night; per_night is {d['per_night']}")
        for a, b in zip(list_, list_[1:]):
            if len(a) > 1 and b[0]["start"] < a[-1]["end"]:
                j.fault(f"{field} {demand}: two sets overlap")


def main(survey, visits):
    # ERFA calls years beyond its leap-second table dubious; so they are.
    warnings.filterwarnings("ignore", message=".*dubious year.*")
    sv, rows, j = Survey(survey), read(visits), Judge()
    for name, site in sv.sites.items():
        mine = [r for r in rows if r["site"] == name]
        for at in range(0, len(mine), 20000):
            check_numbers(j, sv, site, mine[at : at + 20000])
        if mine:
            check_nights(j, sv, site, mine)
    check_gaps(j, sv, rows)
    check_visits(j, sv, rows)
    return j.report(rows, sys.stdout)


if __name__ == "__main__":
    if len(sys.argv) != 3:
        raise SystemExit(__doc__)
    sys.exit(1 if main(sys.argv[1], sys.argv[2]) else 0)
