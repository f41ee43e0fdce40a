#!/usr/bin/python3
"""Shows that the outside check can fail: breaks one thing of a good visits
table at a time and wants check_visits.py to say so, by name.

    selftest.py SURVEY VISITS.csv
"""

import contextlib
import csv
import datetime
import io
import os
import sys
import tempfile

import check_visits

NIGHTS = 4


def second_of_a_set(rows):
    seen = set()
    for i, r in enumerate(rows):
        if r["set"] and r["set"] in seen:
            return i
        seen.add(r["set"])
    raise SystemExit("the plan has no sets")


def next_on_telescope(rows):
    """Two exposures of one telescope and night that follow each other."""
    last = {}
    for i, r in enumerate(rows):
        k = last.get(r["telescope"])
        if k is not None and rows[k]["night"] == r["night"]:
            return k, i
        last[r["telescope"]] = i
    raise SystemExit("the plan has no two exposures in a row")


def add(name, by):
    def do(rows):
        rows[len(rows) // 2][name] = repr(float(rows[len(rows) // 2][name]) + by)

    return do


def delete(rows):
    del rows[second_of_a_set(rows)]


def label(rows):
    day = datetime.date.fromisoformat(rows[0]["night"]) + datetime.timedelta(days=1)
    rows[0]["night"] = day.isoformat()


def overlap(rows):
    a, b = next_on_telescope(rows)
    rows[b]["start_utc"] = rows[a]["start_utc"]


def twice(rows):
    rows[1]["visit"] = rows[0]["visit"]


def swap_filter(rows):
    r = rows[second_of_a_set(rows)]
    r["filter"] = "g" if r["filter"] == "r" else "r"


def early(rows):
    """The whole table three hours early: the sky is another."""
    for r in rows:
        for k in ("start_utc", "end_utc"):
            t = datetime.datetime.fromisoformat(r[k].replace("Z", "+00:00")) - datetime.timedelta(hours=3)
            r[k] = t.strftime("%Y-%m-%dT%H:%M:%S.%fZ")


def crowded(rows):
    """A second visit of a demand a minute after the first, on no demand's terms."""
    first = {}
    for r in rows:
        k = r["field"], r["demand"]
        if not r["set"] and k in first:
            for name in ("start_utc", "end_utc", "night", "telescope", "site"):
                r[name] = first[k][name]
            return
        first.setdefault(k, r)
    raise SystemExit("the plan has no demand with two visits")


BROKEN = [
    ("altitude of 0.02 arcsec", add("altitude_deg", 0.02 / 3600), "altitude "),
    ("azimuth", add("azimuth_deg", 0.001), "azimuth on the sky "),
    ("airmass", add("airmass", 1e-6), "airmass "),
    ("sun", add("sun_altitude_deg", 0.2 / 3600), "sun altitude "),
    ("moon", add("moon_altitude_deg", 0.2 / 3600), "moon altitude "),
    ("separation", add("moon_separation_deg", 0.2 / 3600), "moon separation "),
    ("sky", add("sky_mag_arcsec2", 2e-4), "sky "),
    ("quality", add("quality", 2e-4), "quality "),
    ("credit", add("credit", 1e-7), "credit "),
    ("length", add("exposure_s", 1e-5), "exposure length "),
    ("gap", add("gap_before_s", 2e-3), "needed gap "),
    ("a set's exposure left out", delete, "it isn't whole"),
    ("label", label, "it isn't within the night"),
    ("overlap", overlap, "it overlaps"),
    ("id", twice, "is there twice"),
    ("filter", swap_filter, "its filter is"),
    ("three hours early", early, "altitude_min_deg"),
    ("cadence", crowded, "gap.min is"),
]


def main(survey, visits):
    with open(visits, encoding="utf-8", newline="") as f:
        reader = csv.DictReader(f)
        names, good = reader.fieldnames, list(reader)
    # The first nights of a plan are enough, each of them whole.
    kept = sorted({r["night"] for r in good})[:NIGHTS]
    good = [r for r in good if r["night"] in kept]
    failed = 0
    for what, do, want in [("nothing", lambda rows: None, None), *BROKEN]:
        rows = [dict(r) for r in good]
        do(rows)
        with tempfile.TemporaryDirectory() as folder:
            path = os.path.join(folder, "visits.csv")
            with open(path, "w", encoding="utf-8", newline="") as f:
                w = csv.DictWriter(f, names)
                w.writeheader()
                w.writerows(rows)
            out = io.StringIO()
            with contextlib.redirect_stdout(out):
                bad = check_visits.main(survey, path)
        told = [line for line in out.getvalue().splitlines() if "OVER" in line or line.startswith("fault:")]
        good_told = not bad if want is None else bad and any(want in line for line in told)
        print(f"{'ok ' if good_told else 'BAD'} {what}: {told[0] if told else 'nothing told'}")
        failed += not good_told
    return failed


if __name__ == "__main__":
    if len(sys.argv) != 3:
        raise SystemExit(__doc__)
    sys.exit(1 if main(sys.argv[1], sys.argv[2]) else 0)
