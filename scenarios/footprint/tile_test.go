package footprint

import (
	"context"
	"math"
	"math/rand/v2"
	"strings"
	"testing"

	"nightwright/visibility"
	"nightwright/visibility/ephemeris"
)

// lattice finds the fields near a direction by the HEALPix cells they touch.
type lattice struct {
	order int
	cells map[int64][]int32
	at    []ephemeris.Vec
	reach float64
}

func newLattice(fields []Field, radius float64) *lattice {
	l := &lattice{order: min(10, OrderFor(2*radius)), cells: map[int64][]int32{}, reach: radius}
	for i, f := range fields {
		l.at = append(l.at, f.Centre)
		// Every cell with a point in the circle has its centre within the
		// circle widened by a cell's reach.
		for _, c := range CoverCircles(l.order, []Circle{{f.Centre, radius + cellReach[l.order]}}).Cells() {
			n := below(c.Order) / below(l.order)
			for k := range n {
				l.cells[c.Index*n+k] = append(l.cells[c.Index*n+k], int32(i))
			}
		}
	}
	return l
}

// holds counts the fields that hold a direction.
func (l *lattice) holds(v ephemeris.Vec) int {
	n := 0
	for _, i := range l.cells[CellAt(l.order, v).Index] {
		if separation(l.at[i], v) <= l.reach {
			n++
		}
	}
	return n
}

func tiled(t testing.TB, r *Region, tl Tiling) []Field {
	t.Helper()
	fields, err := tl.Fields(context.Background(), r)
	if err != nil {
		t.Fatal(err)
	}
	return fields
}

func regionOf(s ...Shape) *Region {
	r := &Region{}
	for _, x := range s {
		r.Parts = append(r.Parts, Part{Shape: x, Weight: 1, Program: "wide"})
	}
	return r
}

var wholeSphere = NewZone(visibility.Equatorial, -math.Pi/2, math.Pi/2, 0, 2*math.Pi)

// TestWholeSkyWithoutGaps: a million random points of the whole sky, and as
// many near the poles, the equator and the seams, all lie in a field of 1
// degree; and the fields are few.
func TestWholeSkyWithoutGaps(t *testing.T) {
	fields := tiled(t, regionOf(wholeSphere), Tiling{Diameter: degree})
	l := newLattice(fields, degree/2*(1+1e-12))
	rng := rand.New(rand.NewPCG(9, 1))
	missed, sum := 0, 0
	const points = 1_000_000
	for range points {
		n := l.holds(randomDirection(rng))
		sum += n
		if n == 0 {
			missed++
		}
	}
	for range 50_000 {
		pole := Direction(2*math.Pi*rng.Float64(), math.Copysign(math.Pi/2-3*degree*rng.Float64(), rng.Float64()-0.5))
		if l.holds(pole) == 0 {
			missed++
		}
	}
	// On the meridians through the gaps of each row, towards the next: where
	// their counts differ, the gaps of both meet somewhere.
	rows := wholeSky(degree / 2)
	for i := range len(rows) - 1 {
		row, next := rows[i], rows[i+1]
		if math.Abs(next.dec) < math.Abs(row.dec) {
			row, next = next, row
		}
		gaps := 1 // staggered rows are the same at every gap
		if row.count != next.count {
			gaps = row.count
		}
		for g := range gaps {
			ra := 2 * math.Pi * (float64(g) + row.shift + 0.5) / float64(row.count)
			for k := range 60 {
				if l.holds(Direction(ra, row.dec+(next.dec-row.dec)*float64(k)/60)) == 0 {
					missed++
				}
			}
		}
	}
	if missed > 0 {
		t.Errorf("%d points lie in no field", missed)
	}
	ratio := float64(len(fields)) * (Cap{Radius: degree / 2}).Area() / (4 * math.Pi) / LeastPerArea
	if ratio > 1.05 {
		t.Errorf("%d fields are %.3f times the least; want 1.05 at most", len(fields), ratio)
	}
	// The mean number of fields a point lies in is their area over the sky's.
	if mean := float64(sum) / points; math.Abs(mean-ratio*LeastPerArea) > 0.003 {
		t.Errorf("a point lies in %.4f fields; areas say %.4f", mean, ratio*LeastPerArea)
	}
	t.Logf("%d fields of 1 deg, %.4f times the least covering", len(fields), ratio)
}

// TestAllSizesWithoutGaps: from fine fields to ones of a third of the sky.
func TestAllSizesWithoutGaps(t *testing.T) {
	rng := rand.New(rand.NewPCG(10, 1))
	for _, deg := range []float64{3, 5, 7.3, 10, 14, 20, 31, 45, 60, 75, 90, 105, 120, 140, 160} {
		fields := tiled(t, regionOf(wholeSphere), Tiling{Diameter: deg * degree})
		l := newLattice(fields, deg*degree/2*(1+1e-12))
		for k := range 20_000 {
			v := randomDirection(rng)
			if k%10 == 0 {
				v = Direction(2*math.Pi*rng.Float64(), math.Copysign(math.Pi/2-deg*degree*rng.Float64(), rng.Float64()-0.5))
			}
			if l.holds(v) == 0 {
				ra, dec := Angles(v)
				t.Fatalf("fields of %g deg leave (%.3f, %.3f) deg open", deg, ra/degree, dec/degree)
			}
		}
		ratio := float64(len(fields)) * (Cap{Radius: deg * degree / 2}).Area() / (4 * math.Pi) / LeastPerArea
		if deg <= 20 && ratio > 1.15 || ratio > 1.75 {
			t.Errorf("fields of %g deg: %d, %.3f times the least", deg, len(fields), ratio)
		}
	}
}

// TestRegionsWithoutGaps: every random point of a region lies in a field, no
// field is apart from it, and an overlap makes more of them.
func TestRegionsWithoutGaps(t *testing.T) {
	rng := rand.New(rand.NewPCG(11, 1))
	box := NewZone(visibility.Equatorial, -12*degree, 7*degree, 350*degree, 25*degree)
	holed := regionOf(NewZone(visibility.Ecliptic, -10*degree, 10*degree, 100*degree, 60*degree))
	holed.Exclude = []Part{{Shape: NewZone(visibility.Galactic, -8*degree, 8*degree, 0, 2*math.Pi)}, {Shape: Cap{Direction(2.2, 0.3), 3 * degree}}}
	for name, r := range map[string]*Region{
		"box": regionOf(box), "holed strip": holed,
		"pole":    regionOf(Cap{Direction(0, math.Pi/2), 7 * degree}),
		"polygon": regionOf(corners(t, 10, 60, 40, 70, 80, 65, 60, 85, 20, 80)),
		"map":     regionOf(Map{NewMOC(4, []Cell{{3, 300}, {4, 77}, {4, 1300}})}),
		"speck":   regionOf(Cap{Direction(1, 1), 0.01 * degree}),
	} {
		tl := Tiling{Diameter: 1.5 * degree}
		fields := tiled(t, r, tl)
		l := newLattice(fields, tl.Diameter/2*(1+1e-12))
		inside := 0
		for range 400_000 {
			if v := randomDirection(rng); r.Holds(v) {
				inside++
				if l.holds(v) == 0 {
					ra, dec := Angles(v)
					t.Fatalf("%s: (%.3f, %.3f) deg lies in no field", name, ra/degree, dec/degree)
				}
			}
		}
		if name != "speck" && inside < 200 {
			t.Errorf("%s: only %d points inside", name, inside)
		}
		idle := 0
		for _, f := range fields {
			touch := false
			for range 4000 {
				if touch = r.Holds(moved(f.Centre, tl.Diameter/2*math.Sqrt(rng.Float64()), 2*math.Pi*rng.Float64())); touch {
					break
				}
			}
			if !touch {
				idle++ // touches by less than a few thousandths, or not at all
			}
		}
		if idle > 1+len(fields)/20 && name != "speck" {
			t.Errorf("%s: %d of %d fields have next to nothing of the region", name, idle, len(fields))
		}
		if name == "speck" && len(fields) > 3 {
			t.Errorf("a speck takes %d fields", len(fields))
		}
		tl.Overlap = 0.1
		if more := tiled(t, r, tl); name != "speck" && len(more) <= len(fields) {
			t.Errorf("%s: %d fields, and %d with an overlap", name, len(fields), len(more))
		}
	}
}

func TestWeightsProgramsAndDithers(t *testing.T) {
	r := &Region{Parts: []Part{
		{Weight: 1, Program: "wide", Shape: Cap{Direction(1, 0.2), 10 * degree}},
		{Weight: 4, Program: "deep", Shape: Cap{Direction(1, 0.2), 3 * degree}},
	}}
	tl := Tiling{Diameter: 2 * degree, Dithers: 3, Step: 0.3 * degree, Prefix: "K", Weights: []WeightCircle{{Circle{Direction(1, 0.2), 1 * degree}, 0.5}}}
	fields := tiled(t, r, tl)
	n := len(fields) / 3
	if len(fields)%3 != 0 || fields[0].Name != "K0001-1" || fields[n].Name != "K0001-2" {
		t.Fatalf("%d fields, the first is %q", len(fields), fields[0].Name)
	}
	seen := map[string]bool{}
	for i, f := range fields {
		d := separation(f.Centre, Direction(1, 0.2))
		want, program := 1.0, "wide"
		if base := separation(fields[i%n].Centre, Direction(1, 0.2)); base <= 3*degree {
			want, program = 4, "deep"
		}
		if d <= degree {
			want /= 2
		}
		if f.Weight != want || f.Program != program {
			t.Errorf("%s, %.2f deg from the middle: weight %g of %s, want %g of %s", f.Name, d/degree, f.Weight, f.Program, want, program)
		}
		if moved := separation(f.Centre, fields[i%n].Centre); i >= n && math.Abs(moved-tl.Step) > 1e-12 {
			t.Errorf("%s is moved by %g, want %g", f.Name, moved, tl.Step)
		}
		if seen[f.Name] {
			t.Errorf("%s is there twice", f.Name)
		}
		seen[f.Name] = true
	}
}

func TestTilingRefuses(t *testing.T) {
	sky := regionOf(wholeSphere)
	if _, err := (Tiling{Diameter: 0.05 * degree}).Fields(context.Background(), sky); err == nil || !strings.Contains(err.Error(), "more than 1000000 fields") {
		t.Errorf("%v", err)
	}
	if _, err := (Tiling{Diameter: 1e-4 * degree}).Fields(context.Background(), sky); err == nil || !strings.Contains(err.Error(), "too small") {
		t.Errorf("%v", err)
	}
	ctx, stop := context.WithCancel(context.Background())
	stop()
	if _, err := (Tiling{Diameter: degree}).Fields(ctx, sky); err != context.Canceled {
		t.Errorf("%v", err)
	}
}

func BenchmarkWholeSky(b *testing.B) {
	r := regionOf(wholeSphere)
	for b.Loop() {
		tiled(b, r, Tiling{Diameter: degree})
	}
}
