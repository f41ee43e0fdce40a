package footprint

import (
	"math"
	"math/rand/v2"
	"strings"
	"testing"

	"nightwright/visibility"
	"nightwright/visibility/ephemeris"
)

func corners(t testing.TB, deg ...float64) Polygon {
	t.Helper()
	var at []ephemeris.Vec
	for i := 0; i < len(deg); i += 2 {
		at = append(at, Direction(deg[i]*degree, deg[i+1]*degree))
	}
	p, err := NewPolygon(at)
	if err != nil {
		t.Fatal(err)
	}
	return p
}

// shapes are shapes with their areas, sr, by closed forms of spherical
// geometry (common practice): cap 2 pi (1 - cos r), zone width (sin b - sin
// a), triangle the sum of its angles less pi.
func shapes(t testing.TB) map[string]struct {
	shape Shape
	area  float64
} {
	type entry = struct {
		shape Shape
		area  float64
	}
	zone := func(s visibility.Coordinates, south, north, west, width float64) Zone {
		return NewZone(s, south*degree, north*degree, west*degree, width*degree)
	}
	sin := func(deg float64) float64 { return math.Sin(deg * degree) }
	return map[string]entry{
		"small cap":          {Cap{Direction(1, 0.5), 2 * degree}, 2 * math.Pi * (1 - math.Cos(2*degree))},
		"cap at a pole":      {Cap{Direction(0, math.Pi/2), 20 * degree}, 2 * math.Pi * (1 - math.Cos(20*degree))},
		"large cap":          {Cap{Direction(2, -0.3), 130 * degree}, 2 * math.Pi * (1 - math.Cos(130*degree))},
		"whole sky":          {zone(visibility.Equatorial, -90, 90, 0, 360), 4 * math.Pi},
		"band":               {zone(visibility.Equatorial, -30, 10, 0, 360), 2 * math.Pi * (sin(10) + sin(30))},
		"band to the pole":   {zone(visibility.Equatorial, 60, 90, 0, 360), 2 * math.Pi * (1 - sin(60))},
		"box over 0 h":       {zone(visibility.Equatorial, -5, 25, 350, 30), 30 * degree * (sin(25) + sin(5))},
		"wide box":           {zone(visibility.Equatorial, -40, 40, 20, 250), 250 * degree * 2 * sin(40)},
		"octant as a box":    {zone(visibility.Equatorial, 0, 90, 90, 90), math.Pi / 2},
		"strip on ecliptic":  {zone(visibility.Ecliptic, -10, 10, 0, 360), 4 * math.Pi * sin(10)},
		"part of the galaxy": {zone(visibility.Galactic, -5, 15, 300, 120), 120 * degree * (sin(15) + sin(5))},
		"octant":             {corners(t, 0, 0, 90, 0, 0, 90), math.Pi / 2},
		"octant, backwards":  {corners(t, 0, 90, 90, 0, 0, 0), math.Pi / 2},
		// A lune of 50 deg, its corners joined at the equator: 2 x 50 deg.
		"lune": {corners(t, 10, 90, 10, 0, 10, -90, 60, 0), 2 * 50 * degree},
		"map":  {Map{NewMOC(3, []Cell{{2, 5}, {2, 100}, {3, 0}, {0, 11}})}, 2*CellArea(2) + CellArea(3) + CellArea(0)},
	}
}

func TestAreasAgainstClosedForms(t *testing.T) {
	for name, s := range shapes(t) {
		if d := s.shape.Area() - s.area; math.Abs(d) > 1e-12 {
			t.Errorf("%s: area %.15g sr, closed form %.15g", name, s.shape.Area(), s.area)
		}
		r := Region{Parts: []Part{{Shape: s.shape}}}
		if a := r.areaByCells(); math.Abs(a-s.area) > 3e-5 {
			t.Errorf("%s: area by cells %.10g sr, closed form %.10g", name, a, s.area)
		}
	}
}

// TestSmallTriangles: for triangles of a few arcminutes the plane's formula
// holds to a millionth.
func TestSmallTriangles(t *testing.T) {
	p := corners(t, 30, 0, 30.1, 0, 30, 0.1)
	if plane := 0.1 * 0.1 / 2 * degree * degree; math.Abs(p.Area()/plane-1) > 1e-5 {
		t.Errorf("area %g, in a plane %g", p.Area(), plane)
	}
}

// TestPlacesAreProven: no point of a cap that is Within may be outside, none
// of one that is Apart inside.
func TestPlacesAreProven(t *testing.T) {
	rng := rand.New(rand.NewPCG(7, 1))
	bent := corners(t, 10, 10, 40, 0, 35, 30, 60, 50, 20, 45, 25, 25)
	all := shapes(t)
	all["bent"] = struct {
		shape Shape
		area  float64
	}{bent, 0}
	for name, s := range all {
		seen := map[Place]int{}
		for range 1500 {
			v, radius := randomDirection(rng), 0.4*rng.Float64()*rng.Float64()
			place := s.shape.Place(v, radius)
			seen[place]++
			if place == Across {
				continue
			}
			for range 8 {
				p := moved(v, radius*math.Sqrt(rng.Float64()), 2*math.Pi*rng.Float64())
				if s.shape.Holds(p) != (place == Within) {
					t.Fatalf("%s: a cap of %g is %v, but holds a point that isn't", name, radius, place)
				}
			}
		}
		if name != "whole sky" && (seen[Apart] == 0 || seen[Within] == 0 && s.area > 0.05 || seen[Across] == 0) {
			t.Errorf("%s: places %v; want some of each", name, seen)
		}
	}
}

// TestHoldsByProjection: a polygon on the sky of less than a half is a plane
// one in the gnomonic projection, where great circles are straight.
func TestHoldsByProjection(t *testing.T) {
	rng := rand.New(rand.NewPCG(8, 1))
	p := corners(t, -30, -20, 20, -30, 35, 5, 5, 0, 30, 30, -25, 35, -5, 5)
	n := len(p.at)
	for range 5000 {
		v := randomDirection(rng)
		want := false
		if v[0] > 0 {
			x, y := v[1]/v[0], v[2]/v[0]
			for i := range n {
				a, b := p.at[i], p.at[(i+1)%n]
				ax, ay, bx, by := a[1]/a[0], a[2]/a[0], b[1]/b[0], b[2]/b[0]
				if (ay > y) != (by > y) && x < (bx-ax)*(y-ay)/(by-ay)+ax {
					want = !want
				}
			}
		}
		if got := p.Holds(v); got != want {
			t.Fatalf("%v is inside: %v; in projection: %v", v, got, want)
		}
	}
}

func TestBadPolygons(t *testing.T) {
	for _, tt := range []struct {
		msg  string
		give []float64
		want string
	}{
		{"bow tie", []float64{0, 0, 10, 10, 10, 0, 0, 10}, "crosses or touches itself: its sides from corner 1 and from corner 3"},
		{"spike", []float64{0, 0, 10, 0, 5, 0, 5, 10}, "crosses or touches itself"},
		{"corner on a side", []float64{0, 0, 20, 0, 20, 10, 10, 0, 0, 10}, "crosses or touches itself"},
		{"on a line", []float64{0, 0, 10, 0, 20, 0}, "crosses or touches itself"},
		{"two corners", []float64{0, 0, 10, 0}, "has 2 corners; want 3 or more"},
		{"the same twice", []float64{0, 0, 10, 0, 10, 0, 5, 5}, "corners 2 and 3 of the polygon are the same"},
		{"closed by hand", []float64{0, 0, 10, 0, 5, 5, 0, 0}, "corners 4 and 1 of the polygon are the same"},
		{"opposite", []float64{0, 0, 180, 0, 90, 50}, "corners 1 and 2 of the polygon are opposite"},
	} {
		var at []ephemeris.Vec
		for i := 0; i < len(tt.give); i += 2 {
			at = append(at, Direction(tt.give[i]*degree, tt.give[i+1]*degree))
		}
		if _, err := NewPolygon(at); err == nil || !strings.Contains(err.Error(), tt.want) {
			t.Errorf("%s: %v; want %q", tt.msg, err, tt.want)
		}
	}
}

func TestPartsAndExclusions(t *testing.T) {
	r := Region{
		Parts: []Part{
			{Name: "wide", Weight: 1, Shape: Cap{Direction(0, 0), 0.3}},
			{Name: "deep", Weight: 3, Shape: Cap{Direction(0.2, 0), 0.2}},
		},
		Exclude: []Part{{Shape: Cap{Direction(-0.1, 0), 0.05}}},
	}
	for _, tt := range []struct {
		ra   float64
		part int
		in   bool
	}{{-0.2, 0, true}, {0.1, 1, true}, {0.39, 1, true}, {0.5, -1, false}, {-0.1, 0, false}} {
		v := Direction(tt.ra, 0)
		if r.PartAt(v) != tt.part || r.Holds(v) != tt.in {
			t.Errorf("at %g: part %d, in the region %v; want %d, %v", tt.ra, r.PartAt(v), r.Holds(v), tt.part, tt.in)
		}
	}
	if r.Place(Direction(-0.1, 0), 0.04) != Apart || r.Place(Direction(-0.1, 0), 0.06) != Across || r.Place(Direction(0.2, 0), 0.1) != Within {
		t.Error("an exclusion takes its caps away")
	}
	// Two caps that overlap: inclusion and exclusion against the parts' sum.
	if a := r.Area(); a >= r.Parts[0].Shape.Area()+r.Parts[1].Shape.Area() || a <= r.Parts[0].Shape.Area() {
		t.Errorf("area %g", a)
	}
}
