package surveyfile

import "strings"

// Spec is one key of a survey file: where it stands, what it means, and what
// holds when it is left out.
type Spec struct {
	Path    string // of the mapping it stands in, dots between; "" is the file's top
	Key     string
	Default string // as it would be written; "" when there is none
	Need    bool   // must be written
	About   string // unit and meaning
}

// Name is the key with its path, such as sites.telescopes.keep_free.
func (s Spec) Name() string {
	if s.Path == "" {
		return s.Key
	}
	return s.Path + "." + s.Key
}

// specs is the list of all keys. The reader takes defaults and the need of a
// key from here, so what Defaults tells is what holds.
var specs = []Spec{
	{"", "survey", "", true, "the survey's name"},
	{"", "period", "", true, "the nights to plan"},
	{"", "slot", "10m", false, "width of the time-slot grid; divides 24 h evenly, 60 s or more"},
	{"", "seed", "1", false, "of everything random; the same seed gives the same plan"},
	{"", "finish_bonus", "0", false, "extra credit of a field that gets every visit, as a part of its weight"},
	{"", "fields", "", true, "the field list: a CSV or Parquet file in the survey's folder, or {file, columns}"},
	{"", "earth_orientation", "", false, "UT1-UTC and leap seconds"},
	{"", "filters", "", true, "the passbands"},
	{"", "rules", "", false, "the rules of every exposure; a program, a demand or a field may override any"},
	{"", "programs", "", true, "what is asked for"},
	{"", "sites", "", true, "where from"},
	{"", "networks", "", false, "sets of sites to compare; without it, every removal of one site"},

	{"period", "first_night", "", true, "date of the first night"},
	{"period", "last_night", "", true, "date of the last night, inclusive"},

	{"fields", "file", "", true, "the field list's name"},
	{"fields", "columns", "", false, "what the file calls our columns, such as {ra_deg: RAJ2000}; other columns are then left alone"},

	{"earth_orientation", "dut1_s", "0", false, "UT1-UTC, s, throughout"},
	{"earth_orientation", "iers", "", false, "an IERS finals2000A file, instead of dut1_s"},
	{"earth_orientation", "leap_seconds", "", false, "a leap-second list, instead of the built-in one"},

	{"filters", "name", "", true, "the filter's name"},
	{"filters", "band", "", true, "U, B, V, R or I, whose published twilight serves"},
	{"filters", "extinction", "", true, "mag per airmass"},
	{"filters", "dark_sky", "", true, "dark sky at the zenith, mag/arcsec2"},
	{"filters", "moonlight", "1", false, "scale of the V-band moonlight in this filter"},

	{"rules", "altitude_min_deg", "0", false, "least altitude"},
	{"rules", "airmass_max", "none", false, "most airmass"},
	{"rules", "sun_altitude_max_deg", "-18", false, "highest Sun; -5 at most"},
	{"rules", "moon_separation_min_deg", "0", false, "least distance from the Moon while it is up"},
	{"rules", "moon_illumination_max", "1", false, "most illuminated Moon while it is up, 0 to 1"},
	{"rules", "hour_angle_max_h", "none", false, "most hours from the meridian, either side"},
	{"rules", "min_quality", "0", false, "least quality at the exposure's middle, 0 to 1"},

	{"programs", "name", "", true, "the program's name"},
	{"programs", "weight", "1", false, "times a field's weight"},
	{"programs", "share", "", false, "bounds on its part of all exposure time"},
	{"programs", "telescopes", "all", false, "who may observe it"},
	{"programs", "rules", "", false, "overrides of the survey's rules"},
	{"programs", "demands", "", true, "what it wants of each of its fields"},
	{"programs.share", "min", "0", false, "least part"},
	{"programs.share", "max", "1", false, "greatest part"},

	{"programs.demands", "name", "its filters, joined by +", false, "the demand's name"},
	{"programs.demands", "visits", "", true, "wanted of each field"},
	{"programs.demands", "filter", "", false, "of its exposures, unless it is a set"},
	{"programs.demands", "exposure", "", false, "its length, unless it is a set"},
	{"programs.demands", "repeats", "", false, "a set of equal exposures"},
	{"programs.demands", "set", "", false, "a set of exposures in order"},
	{"programs.demands", "gap", "", false, "between the starts of two visits of one field"},
	{"programs.demands", "per_night", "none", false, "most visits with one night label"},
	{"programs.demands", "rules", "", false, "overrides of the program's rules"},
	{"programs.demands.gap", "min", "0s", false, "least gap, over all telescopes"},
	{"programs.demands.gap", "max", "none", false, "a wish; breaches are counted"},
	{"programs.demands.repeats", "count", "", true, "exposures in the set, 2 or more"},
	{"programs.demands.repeats", "spacing", "", true, "from one start to the next"},
	{"programs.demands.repeats", "tolerance", "", true, "on the spacing, either way"},
	{"programs.demands.set", "filter", "", true, "of this exposure"},
	{"programs.demands.set", "exposure", "", true, "its length"},
	{"programs.demands.set", "after", "", false, "from the start of the one before; not for the first"},
	{"programs.demands.set", "tolerance", "", false, "on after, either way; not for the first"},

	{"sites", "name", "", true, "the site's name"},
	{"sites", "latitude_deg", "", true, "geodetic, WGS84, north positive"},
	{"sites", "longitude_deg", "", true, "east positive, -180 to 180"},
	{"sites", "elevation_m", "0", false, "above the ellipsoid"},
	{"sites", "time_zone", "UTC", false, "IANA name, for showing local time only"},
	{"sites", "horizon", "none", false, "mask of [azimuth, altitude] in degrees, linear in between, closed round"},
	{"sites", "weather", "", false, "the two-state sky; without it always clear"},
	{"sites", "closures", "none", false, "nights or times taken away"},
	{"sites", "cost", "1", false, "any unit; for comparing networks"},
	{"sites", "telescopes", "", true, "its telescopes"},
	{"sites.weather", "clear", "", true, "12 monthly clear fractions, January first"},
	{"sites.weather", "persistence", "", true, "time scale on which the sky forgets its state"},
	{"sites.weather", "region", "", false, "name of the sites that share weather"},
	{"sites.weather", "correlation", "0", false, "of open hours with an equal site of the region, 0 to 1"},
	{"sites.weather", "levels", "none", false, "how an open sky falls short: a list of {share, extinction_mag, seeing}"},
	{"sites.weather", "level_persistence", "3h", false, "time scale on which the levels change"},
	{"sites.weather.levels", "share", "", true, "part of the open hours, 0 to 1; all together 1 at most"},
	{"sites.weather.levels", "extinction_mag", "0", false, "of thin cloud"},
	{"sites.weather.levels", "seeing", "1", false, "as a multiple of the best, 1 or more"},
	{"sites.closures", "from", "", true, "first night, or an instant"},
	{"sites.closures", "to", "", true, "last night, inclusive, or an instant"},
	{"sites.closures", "why", "", false, "for the record"},

	{"sites.telescopes", "name", "", true, "the telescope's name, unique over all sites"},
	{"sites.telescopes", "mount", "", true, "altazimuth or equatorial"},
	{"sites.telescopes", "field_of_view_deg", "", true, "diameter, or {width, height}"},
	{"sites.telescopes", "altitude_deg", "", false, "the mount's limits"},
	{"sites.telescopes", "azimuth_range_deg", "none", false, "{from, to} that an altazimuth mount can reach, at most 360 wide"},
	{"sites.telescopes", "slew", "", true, "how it moves"},
	{"sites.telescopes", "flip", "none", false, "an equatorial mount's change of side"},
	{"sites.telescopes", "readout", "0s", false, "after each exposure"},
	{"sites.telescopes", "filters", "", true, "names of the filters it carries"},
	{"sites.telescopes", "filter_change", "0s", false, "between exposures in different filters"},
	{"sites.telescopes", "during_slew", "false", false, "true: filters change while readout and slew run"},
	{"sites.telescopes", "exposure_scale", "1", false, "its exposures are this many times the demand's"},
	{"sites.telescopes", "reserved", "none", false, "time taken out of each night before planning"},
	{"sites.telescopes", "keep_free", "0", false, "part of the open time kept for urgent targets"},
	{"sites.telescopes", "closures", "none", false, "nights or times taken away"},
	{"sites.telescopes.field_of_view_deg", "width", "", true, "of a rectangular field, degrees"},
	{"sites.telescopes.field_of_view_deg", "height", "", true, "of a rectangular field, degrees"},
	{"sites.telescopes.altitude_deg", "min", "0", false, "least altitude of the mount"},
	{"sites.telescopes.altitude_deg", "max", "90", false, "greatest altitude of the mount"},
	{"sites.telescopes.azimuth_range_deg", "from", "", true, "degrees, unwrapped"},
	{"sites.telescopes.azimuth_range_deg", "to", "", true, "degrees, unwrapped"},
	{"sites.telescopes.slew", "rate_deg_s", "", true, "greatest speed of each axis"},
	{"sites.telescopes.slew", "acceleration_deg_s2", "", true, "of each axis"},
	{"sites.telescopes.slew", "settle", "0s", false, "after a move"},
	{"sites.telescopes.flip", "time", "", true, "added between exposures on different sides"},
	{"sites.telescopes.flip", "past_meridian", "0s", false, "hour angle to which an exposure may run on past the meridian"},
	{"sites.telescopes.reserved", "at", "", false, "opening or closing, or else every"},
	{"sites.telescopes.reserved", "every", "", false, "repeated at this interval from the night's opening"},
	{"sites.telescopes.reserved", "takes", "", true, "how long"},
	{"sites.telescopes.reserved", "why", "", false, "for the record"},
	{"sites.telescopes.closures", "from", "", true, "first night, or an instant"},
	{"sites.telescopes.closures", "to", "", true, "last night, inclusive, or an instant"},
	{"sites.telescopes.closures", "why", "", false, "for the record"},

	{"networks", "name", "", true, "the network's name"},
	{"networks", "sites", "", true, "names of its sites"},
}

// columnSpecs are the columns of a field list, which the rules' names follow.
var columnSpecs = []Spec{
	{"field list", "field", "", true, "the field's name"},
	{"field list", "ra_deg", "", true, "right ascension, ICRS: degrees, or hours as 12:34:56.7 or 12h34m56.7s"},
	{"field list", "dec_deg", "", true, "declination, ICRS: degrees, or -12:34:56.7 or -12d34m56.7s"},
	{"field list", "program", "", true, "the program it belongs to"},
	{"field list", "weight", "1", false, "times its program's weight"},
	{"field list", "pm_ra_mas_yr", "0", false, "proper motion in right ascension, with cos dec, from J2000"},
	{"field list", "pm_dec_mas_yr", "0", false, "proper motion in declination, from J2000"},
	{"field list", "not_before", "none", false, "an instant, or a date: from 00:00Z of it"},
	{"field list", "not_after", "none", false, "an instant, or a date: to 24:00Z of it"},
	{"field list", "tile_deg", "none", false, "diameter that must fit the field of view"},
	{"field list", "telescopes", "all", false, "names of those that may observe it, with ; between"},
}

// specsAt returns the specs of one mapping. Every path that ends in "rules"
// has the survey's rules, without their defaults: an override left out
// changes nothing. "none" stays, as a word that lifts a limit.
func specsAt(path string) []Spec {
	rules := path != "rules" && strings.HasSuffix(path, "rules")
	if rules {
		path = "rules"
	}
	var at []Spec
	for _, s := range specs {
		if s.Path == path {
			if rules && s.Default != "none" {
				s.Default = ""
			}
			at = append(at, s)
		}
	}
	return at
}

// Defaults lists what holds for keys and columns that a survey leaves out,
// in the order of the survey file.
func Defaults() []Spec {
	var d []Spec
	for _, s := range append(append([]Spec(nil), specs...), columnSpecs...) {
		if s.Default != "" {
			d = append(d, s)
		}
	}
	return d
}
