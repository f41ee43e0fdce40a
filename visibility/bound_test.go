package visibility

import (
	"fmt"
	"math"
	"math/rand/v2"
	"os"
	"testing"

	"nightwright/visibility/ephemeris"
)

// boundRounds is how many nights the bounds are tried on; many more when
// NIGHTWRIGHT_LONG is set.
func boundRounds(usual, many int) int {
	if os.Getenv("NIGHTWRIGHT_LONG") != "" {
		return many
	}
	return usual
}

// trialNight is a random site, day and sky with directions worth a try.
type trialNight struct {
	what   string
	site   Site
	exact  *Exact
	sky    *Sky
	from   float64
	places []Position
}

const (
	nightLength = 14 * 3600.0
)

// newTrialNight draws a night: any latitude, poles and equator among them, any
// phase of the Moon, any filter, and fields all over the sky, near the Moon,
// through the zenith, and skimming the horizon.
func newTrialNight(seed uint64) *trialNight {
	r := rand.New(rand.NewPCG(seed, 11))
	between := func(lo, hi float64) float64 { return lo + (hi-lo)*r.Float64() }
	n := &trialNight{exact: NewExact(ephemeris.NewClock(nil, ephemeris.Orientation{}))}
	n.site = Site{Longitude: between(-180, 180) * degree, Elevation: between(0, 4000)}
	switch r.IntN(6) {
	case 0:
		n.site.Latitude = []float64{90, -90, 0, 89.9, -89.5}[r.IntN(5)] * degree
	default:
		n.site.Latitude = math.Asin(between(-1, 1))
	}
	day := math.Floor(between(20454, 24106)) // 2026 to 2035
	n.from = day*86400 + math.Floor(between(0, 24))*3600
	var filters []Filter
	for band := BandU; band <= BandI; band++ {
		filters = append(filters, Filter{
			Name: fmt.Sprint(band), Band: band, Extinction: between(0.02, 0.6), DarkSky: between(19, 23), Moonlight: between(0, 2),
		})
	}
	n.what = fmt.Sprintf("seed %d, latitude %.4f, from %.0f", seed, n.site.Latitude/degree, n.from)
	// Fields by horizon coordinates at a moment of the night, turned into
	// positions by the exact path's own small changes: near enough.
	t := n.from + between(0, nightLength)
	moon := n.exact.Moon(n.site, t)
	lst := n.exact.At(t).SiderealTime(n.site.Longitude)
	add := func(ha, dec float64) {
		n.places = append(n.places, Position{RA: math.Mod(lst-ha+4*math.Pi, 2*math.Pi), Dec: math.Max(-math.Pi/2, math.Min(math.Pi/2, dec))})
	}
	for range 4 {
		add(between(-math.Pi, math.Pi), math.Asin(between(-1, 1)))
		off, turn := between(0, 20)*degree, between(0, 2*math.Pi)
		add(moon.HourAngle+off*math.Cos(turn)/math.Cos(moon.Declination), moon.Declination+off*math.Sin(turn))
		add(between(-0.02, 0.02), n.site.Latitude+between(-1, 1)*degree)
		add(between(-0.02, 0.02), n.site.Latitude)
	}
	n.sky = NewSky(n.exact, []Site{n.site}, filters, n.places, n.from-3600, n.from+nightLength+3600, 1)
	return n
}

// quality is q on the exact path, of a field in all filters at one instant.
func (n *trialNight) quality(field int, unix float64) []float64 {
	now := n.exact.At(unix)
	star, sun, moon := now.Star(n.site, n.places[field]), now.Sun(n.site), now.Moon(n.site)
	g := Geometry{
		SinAltitude: math.Sin(star.Altitude), SunAltitude: sun.Altitude, MoonAltitude: moon.Altitude,
		MoonSeparation: Separation(star, moon.Horizontal), MoonPhaseAngle: moon.PhaseAngle,
	}
	out := make([]float64, len(n.sky.filters))
	for f := range out {
		out[f] = Quality(n.sky.filters[f].filter, g)
	}
	return out
}

// instants of a cell where a bound is likely to fail: the ends, the middle, at
// random, and just off a moonrise.
func instants(r *rand.Rand, from, to float64) []float64 {
	h := to - from
	out := []float64{from, from + 1e-3, to - 1e-3, from + h/2, from + h*r.Float64(), from + h*r.Float64(), from + h*r.Float64()}
	return append(out, from+math.Min(1, h/3), to-math.Min(1, h/3))
}

// TestBoundGridHolds: in no cell is the exact path's quality above the line
// between the values that Bound gives for the cell's ends.
func TestBoundGridHolds(t *testing.T) {
	cells := 0
	least := math.Inf(1)
	for seed := range uint64(boundRounds(60, 3000)) {
		n := newTrialNight(seed)
		r := rand.New(rand.NewPCG(seed, 12))
		g := n.sky.BoundGrid(0, n.from, n.from+nightLength, 300)
		mid := g.Frames[len(g.Frames)/2].T
		for field := range n.places {
			c := n.sky.Direction(field, mid) // one direction a night, as the ceiling has it
			k := r.IntN(4)
			for ; k < len(g.Frames)-1; k += 1 + r.IntN(8) {
				a, b := &g.Frames[k], &g.Frames[k+1]
				if a.SinSun > math.Sin(-5*degree) || b.SinSun > math.Sin(-5*degree) {
					continue
				}
				if a.SinAltitude(c) < -0.03 && b.SinAltitude(c) < -0.03 {
					continue
				}
				cells++
				for _, at := range instants(r, a.T, b.T) {
					for f, q := range n.quality(field, at) {
						left, right := g.Bound(k, f, c)
						u := (at - a.T) / (b.T - a.T)
						room := left + u*(right-left) - q
						least = math.Min(least, room)
						if room < 0 {
							t.Errorf("%s, field %d, filter %d, cell %d of %g s at %.4f: quality %.9f is over the bound by %.3g (ends %.9f and %.9f; sin altitude %.6f, Sun %.4f deg, sin Moon %.5f, separation %.2f deg)",
								n.what, field, f, k, b.T-a.T, u, q, -room, left, right, a.SinAltitude(c), math.Asin(a.SinSun)/degree, a.SinMoon, math.Acos(a.Moon.Dot(c))/degree)
						}
					}
				}
			}
		}
	}
	t.Logf("%d cells; the bound comes as near as %.3g", cells, least)
}

// TestNodeQualityHolds is the same for the lines between node values, at the
// steps that windows and the price search use.
func TestNodeQualityHolds(t *testing.T) {
	cells := 0
	least, off := math.Inf(1), 0.0
	for seed := range uint64(boundRounds(40, 2000)) {
		n := newTrialNight(seed + 1e6)
		r := rand.New(rand.NewPCG(seed, 13))
		step := []float64{300, 600}[seed%2]
		g := n.sky.FrameGrid(0, n.from, n.from+nightLength, step)
		mid := g.Frames[len(g.Frames)/2].T
		for field := range n.places {
			c := n.sky.Direction(field, mid)
			for k := r.IntN(3); k < g.Cells(); k += 1 + r.IntN(5) {
				a, b := &g.Frames[k], &g.Frames[k+1]
				if a.SinSun > math.Sin(-5*degree) || b.SinSun > math.Sin(-5*degree) || a.SinAltitude(c) < -0.05 {
					continue
				}
				cells++
				for _, at := range instants(r, a.T, b.T) {
					for f, q := range n.quality(field, at) {
						there, left := n.sky.NodeQuality(g, k, f, c)
						_, right := n.sky.NodeQuality(g, k+1, f, c)
						off = math.Max(off, math.Abs(there-n.sky.Quality(a, f, c)))
						u := (at - a.T) / step
						room := left + u*(right-left) - q
						least = math.Min(least, room)
						if room < 0 {
							t.Errorf("%s, field %d, filter %d, cell %d of %g s at %.4f: quality %.9f is over the bound by %.3g (ends %.9f and %.9f; sin altitude %.6f, Sun %.4f deg, sin Moon %.5f)",
								n.what, field, f, k, step, u, q, -room, left, right, a.SinAltitude(c), math.Asin(a.SinSun)/degree, a.SinMoon)
						}
					}
				}
			}
		}
	}
	if off > 1e-12 {
		t.Errorf("the node's quality is off Sky.Quality by %.3g", off)
	}
	t.Logf("%d cells; the bound comes as near as %.3g", cells, least)
}

// TestBoundHoldsWhereTheMoonDips puts the Moon's lower culmination a few arc
// seconds under the horizon of a place at high latitude: it is down for less
// than a cell, up at both ends of it.
func TestBoundHoldsWhereTheMoonDips(t *testing.T) {
	e := NewExact(ephemeris.NewClock(nil, ephemeris.Orientation{}))
	r := rand.New(rand.NewPCG(1, 14))
	filter := Filter{Name: "w", Band: BandV, Extinction: 0.05, DarkSky: 22, Moonlight: 1}
	met := 0
	for trial := 0; trial < boundRounds(600, 6000); trial++ {
		// An instant in the middle of a cell, and the meridian on which the
		// Moon culminates below the pole then.
		at := math.Floor(20454+r.Float64()*3652)*86400 + 43200 + 150
		site := Site{Latitude: 70 * degree}
		for range 3 {
			site.Longitude = math.Remainder(site.Longitude+math.Pi-e.Moon(site, at).HourAngle, 2*math.Pi)
		}
		// The Moon's own motion moves its lowest moment off the meridian.
		lo, hi := 50*degree, 80*degree // from down to up, if it goes north
		low := func(lat float64) float64 {
			site.Latitude = lat
			for range 6 {
				a, b, c := e.Moon(site, at-60).Altitude, e.Moon(site, at).Altitude, e.Moon(site, at+60).Altitude
				late := -60 * (c - a) / 2 / (a - 2*b + c)
				site.Longitude += earthRate * math.Max(-3600, math.Min(3600, late))
			}
			return e.Moon(site, at).Altitude + 2e-6
		}
		if low(lo) > 0 || low(hi) < 0 {
			continue
		}
		for hi-lo > 1e-9 {
			if m := (lo + hi) / 2; low(m) > 0 {
				hi = m
			} else {
				lo = m
			}
		}
		if e.Sun(site, at).Altitude > -10*degree {
			continue
		}
		n := &trialNight{what: fmt.Sprint("dip ", trial), site: site, exact: e}
		for range 20 {
			n.places = append(n.places, Position{RA: r.Float64() * 2 * math.Pi, Dec: math.Asin(0.6 + 0.4*r.Float64())})
		}
		n.sky = NewSky(e, []Site{site}, []Filter{filter}, n.places, at-7200, at+7200, 1)
		g := n.sky.BoundGrid(0, at-3600, at+3600, 300)
		nodes := n.sky.FrameGrid(0, at-3600, at+3600, 300)
		k, j := g.Cell(at), nodes.Cell(at)
		if nodes.Frames[j].SinMoon <= 0 || nodes.Frames[j+1].SinMoon <= 0 || math.Abs(e.Moon(site, at).Altitude+2e-6) > 1e-7 {
			continue
		}
		met++
		for field := range n.places {
			c := n.sky.Direction(field, at)
			q := n.quality(field, at)[0]
			left, right := g.Bound(k, 0, c)
			u := (at - g.Frames[k].T) / (g.Frames[k+1].T - g.Frames[k].T)
			if over := q - left - u*(right-left); over > 0 {
				t.Errorf("%s, field %d: quality %.6f is %.3g over the cell's bound", n.what, field, q, over)
			}
			_, left = n.sky.NodeQuality(nodes, j, 0, c)
			_, right = n.sky.NodeQuality(nodes, j+1, 0, c)
			if over := q - (left+right)/2; over > 0 {
				t.Errorf("%s, field %d: quality %.6f is %.3g over the nodes' bound", n.what, field, q, over)
			}
		}
	}
	if met < 3 {
		t.Errorf("only %d such nights met", met)
	}
	t.Logf("%d nights", met)
}
