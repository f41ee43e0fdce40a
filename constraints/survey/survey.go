// Package survey holds the validated nouns of a sky survey: what is asked
// for, from where, and under which rules. It knows no files and no YAML: a
// reader elsewhere fills these types, and everything downstream trusts them.
//
// Units: angles in radians, durations in seconds (float64), instants as UTC
// Unix seconds (leap seconds not counted) unless a name says otherwise. Dense
// integer ids index the slices of Survey; names are for the edges.
package survey

import (
	"math"

	"nightwright/visibility"
	"nightwright/visibility/ephemeris"
)

// Survey is the whole problem as the planner wrote it, validated and with
// every default filled in. It is immutable once built.
type Survey struct {
	Name        string
	FirstNight  Day // night labels, inclusive, at every site
	LastNight   Day
	Slot        float64 // width of the time-slot grid, s; slots are multiples of it since 00:00Z
	Seed        uint64
	FinishBonus float64 // b in the coverage formula, >= 0
	Orientation ephemeris.Orientation
	LeapSeconds *ephemeris.LeapTable // nil: the embedded table
	Filters     []visibility.Filter
	Programs    []Program
	Sites       []Site
	Telescopes  []Telescope // of all sites, in file order
	Fields      []Field
	Networks    []Network // empty: every single-site removal is compared
}

// Nights returns the number of night labels of the period.
func (s *Survey) Nights() int { return int(s.LastNight-s.FirstNight) + 1 }

// Rules are the limits under which an exposure is legal; every one holds
// throughout the exposure, except MinQuality, judged at its middle.
type Rules struct {
	AltitudeMin         float64 // rad
	AirmassMax          float64 // Young 1994
	SunAltitudeMax      float64 // rad, never above -5 deg
	MoonSeparationMin   float64 // rad, while the Moon is up
	MoonIlluminationMax float64 // 0..1, while the Moon is up
	HourAngleMax        float64 // rad, on |hour angle|
	MinQuality          float64 // 0..1
}

// Rule names one member of Rules; the zero value is not a rule.
type Rule uint8

// The rules a survey file can set, by the key they have there.
const (
	RuleAltitudeMin         Rule = iota + 1 // altitude_min_deg
	RuleAirmassMax                          // airmass_max
	RuleSunAltitudeMax                      // sun_altitude_max_deg
	RuleMoonSeparationMin                   // moon_separation_min_deg
	RuleMoonIlluminationMax                 // moon_illumination_max
	RuleHourAngleMax                        // hour_angle_max_h
	RuleMinQuality                          // min_quality
)

// Program is a set of demands that its fields all have.
type Program struct {
	Name       string
	Weight     float64
	ShareMin   float64 // of all scaled exposure time; 0 when not asked
	ShareMax   float64 // 1 when not asked
	Telescopes []int   // ids that may observe it; nil: all that qualify
	Demands    []Demand
}

// Demand is what a program wants of each of its fields.
type Demand struct {
	Name      string // given, or the filter's name
	Visits    int
	Exposures []Exposure // one, or a set in order
	GapMin    float64    // s between starts of two visits of one field, network wide
	GapMax    float64    // s, a wish; +Inf when not asked
	PerNight  int        // most visits with one night label; 0: no limit
}

// IsSet reports whether a visit of the demand is several exposures.
func (d *Demand) IsSet() bool { return len(d.Exposures) > 1 }

// Exposure is one exposure of a visit.
type Exposure struct {
	Filter    int
	Duration  float64 // s, before the telescope's exposure scale
	After     float64 // s from the start of the one before to this start; 0 for the first
	Tolerance float64 // s, on After
}

// Field is a position that wants visits.
type Field struct {
	Name    string
	RA, Dec float64 // ICRS at J2000, rad
	// PMRA (with cos dec) and PMDec are the proper motion, rad per Julian year from J2000.
	PMRA, PMDec float64
	Program     int
	Weight      float64 // the field's own; w_f = program weight x this
	NotBefore   float64 // Unix s; -Inf when not asked
	NotAfter    float64 // Unix s; +Inf when not asked
	Tile        float64 // diameter that must fit the field of view, rad; 0: none
	Telescopes  []int   // ids that may observe it; nil: all that qualify
	// Rules, one per demand of the program: survey, then program, then
	// demand, then field overrides applied in that order.
	Rules []Rules
}

// Site is a place with telescopes.
type Site struct {
	Name        string
	Latitude    float64 // geodetic, WGS84, rad
	Longitude   float64 // east positive, rad, as written (-180 and +180 stay apart)
	Elevation   float64 // m
	TimeZone    string  // IANA name; "" means UTC
	Horizon     []HorizonPoint
	Clear       []float64 // 12 monthly clear fractions, or nil
	Persistence float64   // s, of the two-state sky; 0 when no weather is given
	// Region names the sites that share weather; "" is none. Correlation is that
	// of the open hours with those of another site of the region that has the
	// same numbers, 0 to 1.
	Region      string
	Correlation float64
	// Levels are how an open sky falls short of the best; what they leave of 1
	// is an open sky at its best. LevelPersistence is their time scale, s.
	Levels           []SkyLevel
	LevelPersistence float64
	Closures         []Closure
	Cost             float64
	Telescopes       []int // ids
}

// SkyLevel is a state of the open sky: thin cloud, or worse seeing.
type SkyLevel struct {
	Share      float64 // of the open hours, 0 to 1
	Extinction float64 // of the cloud, mag, >= 0
	Seeing     float64 // as a multiple of the best, >= 1
}

// HorizonPoint is a vertex of the horizon mask, ascending in azimuth in
// [0, 2 pi); linear in between, closed round. An empty mask is no mask.
type HorizonPoint struct{ Azimuth, Altitude float64 } // rad

// Closure takes a stretch of nights or an interval of time away.
type Closure struct {
	ByNight    bool
	FirstNight Day // inclusive, when ByNight
	LastNight  Day
	From, To   float64 // Unix s, [From, To), when not ByNight
	Why        string
}

// MountKind tells how a telescope moves.
type MountKind uint8

// The two mounts.
const (
	Altazimuth MountKind = iota + 1
	Equatorial
)

// Telescope is one instrument with its mount, filters and overheads.
type Telescope struct {
	Name          string
	Site          int
	Mount         MountKind
	FieldOfView   FieldOfView
	AltitudeMin   float64 // mount limits, rad
	AltitudeMax   float64
	AzimuthRange  *AzimuthRange // altazimuth only; nil: no wrap limit
	Slew          Slew
	Flip          *Flip // equatorial only; nil: no flip
	Readout       float64
	Filters       []int
	FilterChange  float64
	DuringSlew    bool // filter change and readout run while slewing
	ExposureScale float64
	Reserved      []Reserved
	KeepFree      float64 // part of the open time of each night, 0..1
	Closures      []Closure
}

// HasFilter reports whether the telescope carries the filter.
func (t *Telescope) HasFilter(filter int) bool {
	for _, f := range t.Filters {
		if f == filter {
			return true
		}
	}
	return false
}

// FieldOfView is a circle (Width 0) or a rectangle, rad.
type FieldOfView struct{ Diameter, Width, Height float64 }

// Holds reports whether a circular tile of the given diameter fits.
func (v FieldOfView) Holds(tile float64) bool {
	if v.Width > 0 {
		return tile <= math.Min(v.Width, v.Height)
	}
	return tile <= v.Diameter
}

// AzimuthRange is the unwrapped azimuth an altazimuth mount can reach; at
// most 2 pi wide, so an azimuth has at most one place in it.
type AzimuthRange struct{ From, To float64 }

// Slew is the trapezoid profile of each axis.
type Slew struct {
	Rate         float64 // rad/s
	Acceleration float64 // rad/s^2
	Settle       float64 // s, only when the mount moves
}

// Flip is a German mount's change of side.
type Flip struct {
	Time         float64 // s
	PastMeridian float64 // rad of hour angle
}

// ReservedAt says where in a night a reserved block lies.
type ReservedAt uint8

// The places of a reserved block.
const (
	AtOpening ReservedAt = iota + 1 // at the start of the night's first open time
	AtClosing                       // at the end of its last open time
	AtEvery                         // each Every seconds after the first open time's start
)

// Reserved is time taken out before anything is planned.
type Reserved struct {
	At    ReservedAt
	Every float64 // s, for AtEvery
	Takes float64 // s
	Why   string
}

// Network is a set of sites to be compared with others.
type Network struct {
	Name  string
	Sites []int
}
