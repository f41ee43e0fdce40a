package seasons

import (
	"math"
	"math/rand/v2"
	"testing"
)

func near(t *testing.T, what string, got, want, tol float64) {
	t.Helper()
	if !(math.Abs(got-want) <= tol) {
		t.Errorf("%s is %.6f; want %.6f", what, got, want)
	}
}

// TestMeanInterval works Student's interval by hand: 5 values, s^2 = 2.5,
// t(0.975, 4) = 2.776 (any table of the t distribution, from memory).
func TestMeanInterval(t *testing.T) {
	i := MeanInterval([]float64{1, 2, 3, 4, 5})
	half := 2.776445 * math.Sqrt(2.5/5)
	near(t, "mean", i.Mean, 3, 1e-12)
	near(t, "low", i.Low, 3-half, 1e-5)
	near(t, "high", i.High, 3+half, 1e-5)
	one := MeanInterval([]float64{7})
	if one != (Interval{7, 7, 7}) {
		t.Errorf("one value: %v", one)
	}
}

// TestRatio: a = 2 b exactly has no error; and the ratio of sums by hand.
func TestRatio(t *testing.T) {
	r := Ratio([]float64{2, 4, 6}, []float64{1, 2, 3})
	near(t, "ratio", r.Mean, 2, 1e-12)
	near(t, "its interval", r.High-r.Low, 0, 1e-12)
	near(t, "ratio of sums", Ratio([]float64{1, 2}, []float64{2, 2}).Mean, 0.75, 1e-12)
}

func TestQuantile(t *testing.T) {
	x := []float64{1, 2, 3, 4}
	// R's default, type 7: quantile(1:4, c(.25, .5, .95)) = 1.75, 2.5, 3.85
	// (Hyndman & Fan 1996, worked by hand).
	near(t, "p25", Quantile(x, 0.25), 1.75, 1e-12)
	near(t, "p50", Quantile(x, 0.5), 2.5, 1e-12)
	near(t, "p95", Quantile(x, 0.95), 3.85, 1e-12)
	near(t, "p100", Quantile(x, 1), 4, 0)
}

// TestShapleyByHand is a game of three sites worked on paper, the glove game
// of Shapley & Shubik (1969) in another dress: a site in the north (1) makes a
// network with either of two in the south (2, 3), worth 1. Of the six orders
// site 1 completes it in four: shares 2/3, 1/6, 1/6.
func TestShapleyByHand(t *testing.T) {
	v := []float64{0, 0, 0, 1, 0, 1, 0, 1} // by bits: {}, 1, 2, 12, 3, 13, 23, 123
	got := Shapley(3, v)
	for i, want := range []float64{2.0 / 3, 1.0 / 6, 1.0 / 6} {
		near(t, "share", got[i], want, 1e-12)
	}
}

// TestShapleyAxioms: efficiency, symmetry, dummy and additivity (Shapley 1953),
// on random games.
func TestShapleyAxioms(t *testing.T) {
	rg := rand.New(rand.NewPCG(1, 2))
	const n = 5
	game := func() []float64 {
		v := make([]float64, 1<<n)
		for s := 1; s < len(v); s++ {
			v[s] = rg.Float64()
		}
		return v
	}
	for range 50 {
		a, b := game(), game()
		sum := make([]float64, len(a))
		for s := range sum {
			sum[s] = a[s] + b[s]
		}
		pa, pb, ps := Shapley(n, a), Shapley(n, b), Shapley(n, sum)
		total := 0.0
		for i := range pa {
			total += pa[i]
			near(t, "share of the sum of games", ps[i], pa[i]+pb[i], 1e-12)
		}
		near(t, "sum of shares", total, a[len(a)-1], 1e-12)
		// Player 0 adds 0.3 to every set; 1 and 2 are alike.
		c := game()
		for s := range c {
			if s&1 != 0 {
				c[s] = c[s&^1] + 0.3
			}
			if s>>1&3 == 2 {
				c[s] = c[s&^6|2]
			}
		}
		for s := range c {
			if s&1 != 0 {
				c[s] = c[s&^1] + 0.3
			}
		}
		pc := Shapley(n, c)
		near(t, "a dummy's share", pc[0], 0.3, 1e-12)
		near(t, "equals' shares", pc[1], pc[2], 1e-12)
	}
}
