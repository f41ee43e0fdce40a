"""Reads a survey folder as far as the outside check needs it. It takes a
valid survey for granted: telling faults is the program's business."""

import csv
import math
import os
import re

import yaml

UNITS = {"s": 1, "m": 60, "h": 3600, "d": 86400}
RULES = (
    "altitude_min_deg airmass_max sun_altitude_max_deg moon_separation_min_deg "
    "moon_illumination_max hour_angle_max_h min_quality"
).split()
DEFAULTS = {
    "altitude_min_deg": 0,
    "airmass_max": math.inf,
    "sun_altitude_max_deg": -18,
    "moon_separation_min_deg": 0,
    "moon_illumination_max": 1,
    "hour_angle_max_h": 12,
    "min_quality": 0,
}


def lower(x):
    """Keys in lower case: they are case-insensitive."""
    if isinstance(x, dict):
        return {str(k).lower(): lower(v) for k, v in x.items()}
    if isinstance(x, list):
        return [lower(v) for v in x]
    return x


def seconds(text):
    parts = re.findall(r"([0-9.]+)([smhd])", str(text))
    if not parts and float(text) == 0:
        return 0.0
    return sum(float(n) * UNITS[u] for n, u in parts)


def exposures(demand):
    """(filter, exposure, after, tolerance) of each exposure of a visit."""
    if "set" in demand:
        return [
            (x["filter"], seconds(x["exposure"]), seconds(x.get("after", 0)), seconds(x.get("tolerance", 0)))
            for x in demand["set"]
        ]
    one = (demand["filter"], seconds(demand["exposure"]))
    n = demand.get("repeats", {}).get("count", 1)
    if n == 1:
        return [(*one, 0.0, 0.0)]
    r = demand["repeats"]
    return [(*one, 0.0, 0.0)] + [(*one, seconds(r["spacing"]), seconds(r["tolerance"]))] * (n - 1)


def demand_name(demand):
    if "name" in demand:
        return str(demand["name"])
    return "+".join(x[0] for x in exposures(demand)) if "set" in demand else demand["filter"]


class Survey:
    """The parts of a survey by name."""

    def __init__(self, path):
        if os.path.isdir(path):
            path = os.path.join(path, "survey.yaml")
        with open(path, encoding="utf-8-sig") as f:
            s = lower(yaml.safe_load(f))
        self.bonus = float(s.get("finish_bonus", 0))
        orientation = s.get("earth_orientation") or {}
        if "iers" in orientation:
            raise SystemExit("this check knows a constant dut1_s only, not an IERS file")
        self.dut1 = float(orientation.get("dut1_s", 0))
        self.filters = {f["name"]: f for f in s["filters"]}
        self.programs = {p["name"]: p for p in s["programs"]}
        self.demands = {(p["name"], demand_name(d)): d for p in s["programs"] for d in p["demands"]}
        self.sites, self.telescopes = {}, {}
        for site in s["sites"]:
            self.sites[site["name"]] = tuple(
                [math.radians(site["latitude_deg"]), math.radians(site["longitude_deg"]), float(site.get("elevation_m", 0))]
            )
            for t in site["telescopes"]:
                self.telescopes[t["name"]] = {**t, "site": site["name"], "site_closures": site.get("closures", [])}
        self.rules = s.get("rules") or {}
        self.first, self.last = str(s["period"]["first_night"]), str(s["period"]["last_night"])
        self.read_fields(os.path.dirname(path), s["fields"])

    def read_fields(self, folder, spec):
        columns = {}
        if isinstance(spec, dict):
            columns, spec = spec.get("columns") or {}, spec["file"]
        with open(os.path.join(folder, spec), encoding="utf-8-sig", newline="") as f:
            rows = list(csv.DictReader(f))
        self.fields = {}
        for row in rows:
            get = lambda k, d="": (row.get(columns.get(k, k)) or d).strip()  # noqa: E731
            self.fields[get("field")] = {
                "program": get("program"),
                "weight": float(get("weight", "1")),
                "ra": math.radians(float(get("ra_deg"))),
                "dec": math.radians(float(get("dec_deg"))),
                "pm_ra": math.radians(float(get("pm_ra_mas_yr", "0")) / 3.6e6),
                "pm_dec": math.radians(float(get("pm_dec_mas_yr", "0")) / 3.6e6),
                "rules": {r: float(get(r)) for r in RULES if get(r)},
            }

    def wanted(self, field):
        return sum(int(d["visits"]) for d in self.programs[self.fields[field]["program"]]["demands"])

    def weight(self, field):
        f = self.fields[field]
        return float(self.programs[f["program"]].get("weight", 1)) * f["weight"]

    def rules_of(self, field, demand):
        """Survey, then program, then demand, then field."""
        f = self.fields[field]
        p = self.programs[f["program"]]
        d = self.demands[f["program"], demand]
        out = {**DEFAULTS}
        for level in (self.rules, p.get("rules") or {}, d.get("rules") or {}, f["rules"]):
            out.update({k: float(v) for k, v in level.items()})
        return out
