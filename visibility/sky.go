package visibility

import (
	"math"
	"sync"

	"nightwright/visibility/ephemeris"
)

// Sky answers where any field, the Sun and the Moon stand over any site at
// any instant of a period, from tables: the fast path that windows and search
// run on. Exact is its test oracle.
//
// Field directions are apparent places in the celestial intermediate frame of
// date (proper motion, deflection, aberration, precession-nutation) at daily
// knots, linear in between; topocentric Sun and Moon are vectors in the same
// frame every 600 s. Only the Earth's rotation is evaluated at the instant.
// Error against Exact: under 0.05" for fields more than 10 deg from the Sun,
// under 1" for Sun and Moon (TestSkyAgreesWithExact). Memory: 24 bytes a field
// and day, 72 bytes a site and 600 s.
//
// A Sky is immutable and safe for concurrent use.
type Sky struct {
	clock   *ephemeris.Clock
	sites   []siteSky
	filters []filterSky
	fields  int
	knot0   float64 // Unix s of the first daily knot
	knots   int
	dirs    []ephemeris.Vec // [knot][field], unit to 1e-9
}

const (
	knotStep = 86400.0 // s between direction knots
	bodyStep = 600.0   // s between Sun and Moon vectors
)

// siteSky is what one site adds: its zenith's parts and the Sun and Moon seen
// from it.
type siteSky struct {
	lon            float64
	sinLat, cosLat float64
	vd             float64 // diurnal aberration, rotation speed over c
	t0             float64 // Unix s of the first body row
	rows           []bodyRow
}

// bodyRow is the Sun and Moon at one instant: topocentric apparent unit
// vectors in the intermediate frame, KS91's eq. 20 and the lit fraction.
type bodyRow struct {
	sun, moon    ephemeris.Vec
	istar        float64
	illumination float64
}

// NewSky tabulates [from, to] (UTC, Unix s) for the given sites, filters and
// fields with the given number of workers; the result doesn't depend on it.
func NewSky(e *Exact, sites []Site, filters []Filter, positions []Position, from, to float64, workers int) *Sky {
	s := &Sky{clock: e.clock, fields: len(positions)}
	s.knot0 = math.Floor(from/knotStep) * knotStep
	s.knots = int(math.Ceil((to-s.knot0)/knotStep)) + 1
	if s.knots < 2 {
		s.knots = 2
	}
	s.dirs = make([]ephemeris.Vec, s.knots*s.fields)
	forEach(s.knots, workers, func(k int) {
		apparent(e.clock, positions, s.knot0+float64(k)*knotStep, s.dirs[k*s.fields:(k+1)*s.fields])
	})
	for _, f := range filters {
		s.filters = append(s.filters, newFilterSky(f))
	}
	s.sites = make([]siteSky, len(sites))
	forEach(len(sites), workers, func(i int) { s.sites[i] = newSiteSky(e, sites[i], from, to) })
	return s
}

// apparent fills out with the geocentric apparent directions of the fields at
// one instant, in the intermediate frame of date.
func apparent(clock *ephemeris.Clock, positions []Position, unix float64, out []ephemeris.Vec) {
	t := clock.Centuries(unix)
	q := ephemeris.CelestialToIntermediate(t)
	v := ephemeris.EarthVelocity(t)
	sun := ephemeris.SunGeocentric(t)
	r := sun.Norm()
	e := sun.Scale(-1 / r) // Sun to Earth
	bend := schwarzschildAU / r
	for i := range positions {
		n := positions[i].at(t)
		d := 1 + n.Dot(e)
		if d < 1e-5 { // within the Sun's disc: never observed, keep it finite
			d = 1e-5
		}
		n = n.Add(e.Sub(n.Scale(n.Dot(e))).Scale(bend / d))
		// First order in v/c plus the second-order term: 1e-6".
		nv := n.Dot(v)
		n = n.Add(v).Add(v.Scale(nv / 2)).Unit()
		out[i] = q.Apply(n)
	}
}

// schwarzschildAU is 2 GM/c^2 of the Sun in au (IAU 2015 nominal GM, from
// memory; the reference chain's value agrees to its last digit).
const schwarzschildAU = 1.97412574336e-8

// at returns the ICRS unit vector with proper motion applied, for TT Julian
// centuries t since J2000.
func (p Position) at(t float64) ephemeris.Vec {
	sr, cr := math.Sincos(p.RA)
	sd, cd := math.Sincos(p.Dec)
	n := ephemeris.Vec{cd * cr, cd * sr, sd}
	if p.PMRA == 0 && p.PMDec == 0 {
		return n
	}
	years := 100 * t
	east := ephemeris.Vec{-sr, cr, 0}
	north := ephemeris.Vec{-sd * cr, -sd * sr, cd}
	return n.Add(east.Scale(p.PMRA * years)).Add(north.Scale(p.PMDec * years)).Unit()
}

func newSiteSky(e *Exact, site Site, from, to float64) siteSky {
	o := siteSky{lon: site.Longitude, t0: math.Floor(from/bodyStep) * bodyStep}
	o.sinLat, o.cosLat = math.Sincos(site.Latitude)
	o.vd = rotationSpeed(site)
	n := int(math.Ceil((to-o.t0)/bodyStep)) + 2
	o.rows = make([]bodyRow, n)
	for k := range o.rows {
		t := o.t0 + float64(k)*bodyStep
		fr := Frame{T: t}
		fr.orient(&o, e.clock.ERA(t))
		sun, moon := e.Sun(site, t), e.Moon(site, t)
		o.rows[k] = bodyRow{
			sun:          fr.intermediate(sun.Direction),
			moon:         fr.intermediate(moon.Direction),
			istar:        moonBrightness(moon.PhaseAngle),
			illumination: moon.Illumination,
		}
	}
	return o
}

// rotationSpeed returns the observer's speed by the Earth's rotation over c:
// omega rho cos(phi') / c, WGS84.
func rotationSpeed(site Site) float64 {
	const (
		a     = 6378137.0
		f     = 1 / 298.257223563
		omega = 7.292115e-5 // rad/s
		c     = 299792458.0 // m/s
		e2    = f * (2 - f)
	)
	s, co := math.Sincos(site.Latitude)
	n := a / math.Sqrt(1-e2*s*s)
	return omega * (n + site.Elevation) * co / c
}

// Fields returns the number of fields in the tables.
func (s *Sky) Fields() int { return s.fields }

// Sites returns the number of sites in the tables.
func (s *Sky) Sites() int { return len(s.sites) }

// Filters returns the number of filters in the tables.
func (s *Sky) Filters() int { return len(s.filters) }

// Direction returns the apparent direction of a field at an instant, in the
// intermediate frame of date; unit length to 1e-9.
func (s *Sky) Direction(field int, unix float64) ephemeris.Vec {
	x := (unix - s.knot0) / knotStep
	k := int(x)
	if k < 0 {
		k = 0
	} else if k > s.knots-2 {
		k = s.knots - 2
	}
	w := x - float64(k)
	a, b := &s.dirs[k*s.fields+field], &s.dirs[(k+1)*s.fields+field]
	return ephemeris.Vec{
		a[0] + w*(b[0]-a[0]),
		a[1] + w*(b[1]-a[1]),
		a[2] + w*(b[2]-a[2]),
	}
}

// forEach runs f(0..n-1) on a number of workers; each index is done once, and
// f must write only what belongs to its index.
func forEach(n, workers int, f func(i int)) {
	if workers < 1 {
		workers = 1
	}
	if workers > n {
		workers = n
	}
	var wg sync.WaitGroup
	next := make(chan int)
	for range workers {
		wg.Add(1)
		go func() {
			defer wg.Done()
			for i := range next {
				f(i)
			}
		}()
	}
	for i := range n {
		next <- i
	}
	close(next)
	wg.Wait()
}
