package constraints

import (
	"math"
	"testing"

	"nightwright/visibility"

	"pgregory.net/rapid"
)

// where is tried on sums of waves whose curvature is known, against samples.
func TestWhereMissesNothing(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		type wave struct{ a, w, p float64 }
		var waves []wave
		bend := 0.0
		level := rapid.Float64Range(-2, 2).Draw(t, "level")
		for range rapid.IntRange(1, 4).Draw(t, "waves") {
			w := wave{rapid.Float64Range(0.01, 1).Draw(t, "a"), rapid.Float64Range(1e-5, 3e-3).Draw(t, "w"), rapid.Float64Range(0, 7).Draw(t, "p")}
			bend += w.a * w.w * w.w
			waves = append(waves, w)
		}
		f := func(x float64) float64 {
			y := level
			for _, w := range waves {
				y += w.a * math.Sin(w.w*x+w.p)
			}
			return y
		}
		to := rapid.Float64Range(1, 40000).Draw(t, "to")
		in := where(nil, 0, to, 3600, bend, false, f)
		out := where(nil, 0, to, 3600, bend, true, f)
		for x := 0.0; x < to; x += to / 701 {
			switch y := f(x); {
			case y < -1e-5 && holds(in, x):
				t.Fatalf("f(%g) = %g is held to be at least 0", x, y)
			case y > 1e-5 && !holds(out, x):
				t.Fatalf("f(%g) = %g is missed", x, y)
			case y > 0.01 && !holds(in, x): // what grazes is the only difference
				t.Fatalf("f(%g) = %g is left out", x, y)
			}
		}
		for i := 1; i < len(in); i++ {
			if in[i].From <= in[i-1].To {
				t.Fatalf("intervals %v touch", in)
			}
		}
	})
}

func TestWhereAtTheEnds(t *testing.T) {
	up := func(x float64) float64 { return x - 100 }
	got := where(nil, 0, 1000, 3600, 0, false, up)
	if len(got) != 1 || math.Abs(got[0].From-100) > 2e-3 || got[0].To != 1000 {
		t.Errorf("x >= 100 in [0, 1000]: %v", got)
	}
	if got := where(nil, 5, 5, 3600, 1, true, up); len(got) != 0 {
		t.Errorf("an empty stretch gives %v", got)
	}
	touch := func(x float64) float64 { return -(x - 500) * (x - 500) * 1e-9 }
	if got := where(nil, 0, 1000, 3600, 2e-9, false, touch); len(got) != 0 {
		t.Errorf("a graze is not held: %v", got)
	}
	if got := where(nil, 0, 1000, 3600, 2e-9, true, touch); !holds(got, 500) || seconds(got) > 2 {
		t.Errorf("a graze is kept outward, and little else: %v", got)
	}
	if got := join([]visibility.Interval{{From: 1, To: 2}}, 2, 3); len(got) != 1 || got[0].To != 3 {
		t.Errorf("touching intervals join: %v", got)
	}
}
