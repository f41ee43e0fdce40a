package visibility

// Site is a place on the ground.
type Site struct {
	Latitude  float64 // geodetic, WGS84, rad
	Longitude float64 // east positive, rad, as written: -180 and +180 deg label nights a day apart
	Elevation float64 // m above the ellipsoid
}

// Position is a field's place on the sky: ICRS at epoch J2000.0, rad, with
// its proper motion in rad per Julian year (PMRA includes cos dec).
type Position struct{ RA, Dec, PMRA, PMDec float64 }

// Interval is a stretch of time [From, To), UTC Unix seconds.
type Interval struct{ From, To float64 }

// Band is one of the photometric bands of the published twilight fit.
type Band uint8

// The bands of Patat et al. 2006.
const (
	BandU Band = iota + 1
	BandB
	BandV
	BandR
	BandI
)

// Filter is an optical passband as the quality formula needs it.
type Filter struct {
	Name       string
	Band       Band    // whose published twilight serves
	Extinction float64 // k, mag per airmass
	DarkSky    float64 // zenith dark sky, mag/arcsec^2
	Moonlight  float64 // scale of the V-band moonlight in this filter
}
