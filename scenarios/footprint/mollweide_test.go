package footprint

import (
	"math"
	"testing"
)

// TestMollweide: the map between the equator and a parallel has the sphere's
// share of its area (sin dec of a half, common practice), added up in thin
// strips; its outer meridian is an ellipse.
func TestMollweide(t *testing.T) {
	const steps = 20_000
	area, far, last := 0.0, 2.0, 0.0
	for k := 1; k <= steps; k++ {
		dec := float64(k) / steps * math.Pi / 2
		x, y := Mollweide(2*math.Pi-1e-13, dec)
		area += (far - x) * (y - last) // both halves, mean of the widths below and above
		if k == 1 {
			area = 2 * 2 * y
		}
		far, last = -x, y
		if math.Abs(x*x/4+y*y-1) > 1e-10 {
			t.Fatalf("dec %g is off the ellipse: (%g, %g)", dec, x, y)
		}
		if want := math.Pi * math.Sin(dec); k%500 == 0 && math.Abs(area-want) > 1e-4 {
			t.Errorf("up to dec %g the map has %g, want %g", dec, area, want)
		}
	}
	if x, y := Mollweide(math.Pi, 0); x != 0 || y != 0 {
		t.Errorf("the middle is at (%g, %g)", x, y)
	}
	if x, _ := Mollweide(math.Pi/2, 0); x != 1 {
		t.Errorf("right ascension 90 deg is at %g; want it on the right", x)
	}
}
