package footprint

import (
	"math"
	"math/rand/v2"
	"testing"
)

func TestCellsHoldTheirPoints(t *testing.T) {
	rng := rand.New(rand.NewPCG(3, 1))
	for order := 0; order <= MaxOrder; order++ {
		for range 300 {
			c := Cell{order, rng.Int64N(CellCount(order))}
			// Off the edges by more than a direction's rounding.
			edge := min(0.4, 1e-15/CellSize(order)*20)
			x, y := edge+(1-2*edge)*rng.Float64(), edge+(1-2*edge)*rng.Float64()
			v := c.Point(x, y)
			if got := CellAt(order, v); got != c {
				t.Fatalf("order %d: the point (%g, %g) of cell %d is in cell %d", order, x, y, c.Index, got.Index)
			}
			if d := separation(v, c.Centre()); d > cellReach[order] {
				t.Fatalf("order %d: a point of cell %d is %g from its centre, the bound is %g", order, c.Index, d, cellReach[order])
			}
			if order > 0 {
				if up := CellAt(order-1, v); up.Index != c.Index/4 {
					t.Fatalf("order %d: cell %d lies in cell %d of the order before", order, c.Index, up.Index)
				}
			}
		}
	}
}

func TestCellReachIsTight(t *testing.T) {
	for order := range 5 {
		worst := 0.0
		for i := range CellCount(order) {
			c := Cell{order, i}
			for _, p := range c.Corners() {
				worst = max(worst, separation(p, c.Centre()))
			}
		}
		if worst > cellReach[order] || worst < cellReach[order]*(1-1e-6) {
			t.Errorf("order %d: the farthest corner is %g, the bound %g", order, worst, cellReach[order])
		}
	}
}

// TestKnownCells: the poles and the equator's corners fall where the base
// cells meet; Gorski et al. 2005, figure 4.
func TestKnownCells(t *testing.T) {
	for _, tt := range []struct {
		ra, dec float64 // deg
		want    int64
	}{
		{45, 41.8, 0}, {135, 41.8, 1}, {225, 41.8, 2}, {315, 41.8, 3},
		{0, 0, 4}, {90, 0, 5}, {180, 0, 6}, {270, 0, 7},
		{45, -41.8, 8}, {135, -41.8, 9}, {225, -41.8, 10}, {315, -41.8, 11},
		{10, 90, 0}, {280, 90, 3}, {10, -90, 8}, {280, -90, 11},
	} {
		if got := CellAt(0, Direction(tt.ra*degree, tt.dec*degree)); got.Index != tt.want {
			t.Errorf("(%g, %g) is in base cell %d, want %d", tt.ra, tt.dec, got.Index, tt.want)
		}
	}
}

func TestAngles(t *testing.T) {
	rng := rand.New(rand.NewPCG(4, 1))
	for range 1000 {
		ra, dec := 2*math.Pi*rng.Float64(), math.Asin(2*rng.Float64()-1)
		r, d := Angles(Direction(ra, dec))
		if math.Abs(r-ra) > 1e-13 && math.Abs(d) < 1.5 || math.Abs(d-dec) > 1e-14 {
			t.Fatalf("(%g, %g) comes back as (%g, %g)", ra, dec, r, d)
		}
	}
	if r, _ := Angles(Direction(-1e-18, 0)); r < 0 || r >= 2*math.Pi {
		t.Errorf("right ascension %g; want [0, 2 pi)", r)
	}
}

func TestSpreadAndGather(t *testing.T) {
	rng := rand.New(rand.NewPCG(5, 1))
	for range 1000 {
		v := rng.Int64N(1 << 29)
		if got := gather(spread(v)); got != v {
			t.Fatalf("%b comes back as %b", v, got)
		}
		if spread(v)&spread(rng.Int64N(1<<29))<<1&0x5555555555555555 != 0 {
			t.Fatal("bits at odd places")
		}
	}
}
