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

// heldBy counts the rectangular fields that hold a direction: the plain way.
func heldBy(fields []Field, v ephemeris.Vec, t *Tiling) int {
	n := 0
	near := math.Cos(t.reach() + 1e-9)
	for i := range fields {
		if fields[i].Centre.Dot(v) >= near && rectHolds(fields[i].Centre, v, t.Width+1e-12, t.Height+1e-12) {
			n++
		}
	}
	return n
}

// TestRectanglesLeaveNoGap: random points of the whole sky, and as many about
// the poles and the equator, all lie in a field, for shapes wide and tall.
func TestRectanglesLeaveNoGap(t *testing.T) {
	rng := rand.New(rand.NewPCG(4, 2))
	points := 12_000
	if testing.Short() {
		points = 4_000
	}
	for _, size := range [][2]float64{{8, 8}, {12, 5}, {5, 12}, {3, 9}, {40, 30}, {80, 20}} {
		tl := Tiling{Width: size[0] * degree, Height: size[1] * degree}
		fields := tiled(t, regionOf(wholeSphere), tl)
		missed, sum := 0, 0
		for k := range points {
			v := randomDirection(rng)
			switch k % 4 {
			case 1: // near a pole
				v = Direction(rng.Float64()*2*math.Pi, math.Copysign(math.Pi/2-rng.Float64()*tl.Height*2, rng.Float64()-0.5))
			case 2: // on a row's edge
				f := fields[rng.IntN(len(fields))]
				v = moved(f.Centre, tl.Height/2, 0)
				v = moved(v, (rng.Float64()-0.5)*tl.Width, math.Pi/2)
			}
			n := heldBy(fields, v, &tl)
			sum += n
			if n == 0 {
				missed++
			}
		}
		if missed > 0 {
			t.Errorf("%v deg: %d of %d points lie in no field", size, missed, points)
		}
		per := float64(len(fields)) * tl.FieldArea() / (4 * math.Pi)
		t.Logf("%v deg: %d fields, %.3f a point", size, len(fields), per)
		if per > 1.6 && size[0] < 30 && size[1] < 30 {
			t.Errorf("%v deg: %.2f fields a point; rows waste too much", size, per)
		}
	}
}

// TestSmallRectanglesAreFew: with fields of a degree the sphere is nearly a
// plane, and edge to edge nearly one field a point is enough.
func TestSmallRectanglesAreFew(t *testing.T) {
	tl := Tiling{Width: degree, Height: degree}
	fields := tiled(t, regionOf(wholeSphere), tl)
	if per := float64(len(fields)) * tl.FieldArea() / (4 * math.Pi); per > 1.02 || per < 1 {
		t.Errorf("%d fields, %.4f a point; want 1 to 1.02", len(fields), per)
	}
}

// TestRectArea: a rectangle of 90 by 90 deg is a face of the cube, a sixth of
// the sphere; a small one is as in a plane; and points drawn at random agree.
func TestRectArea(t *testing.T) {
	if got := RectArea(math.Pi/2, math.Pi/2); math.Abs(got-4*math.Pi/6) > 1e-12 {
		t.Errorf("a face of the cube has %v; want %v", got, 4*math.Pi/6)
	}
	if got, want := RectArea(0.01, 0.02), 0.0002; math.Abs(got/want-1) > 1e-4 {
		t.Errorf("a small one has %v; want %v", got, want)
	}
	rng := rand.New(rand.NewPCG(3, 3))
	c, in := Direction(1, 0.7), 0
	const n = 400_000
	for range n {
		if rectHolds(c, randomDirection(rng), 1.1, 0.6) {
			in++
		}
	}
	got, want := 4*math.Pi*float64(in)/n, RectArea(1.1, 0.6)
	if math.Abs(got/want-1) > 0.02 { // 20,000 hits: 0.7 % one sigma
		t.Errorf("random points give %v; want %v", got, want)
	}
}

// TestPrunedRegionsHaveNoGap: what is left of a region's fields still holds
// every point of it, rows and margins apart; and something was left out.
func TestPrunedRegionsHaveNoGap(t *testing.T) {
	rng := rand.New(rand.NewPCG(8, 5))
	box := NewZone(visibility.Equatorial, 20*degree, 30*degree, 350*degree, 25*degree)
	cap := Cap{Centre: Direction(2, -1.2), Radius: 6 * degree}
	points := 40_000
	if testing.Short() {
		points = 20_000
	}
	for name, tt := range map[string]struct {
		r *Region
		t Tiling
	}{
		"circles in a box":      {regionOf(box), Tiling{Diameter: 1.5 * degree}},
		"circles in a cap":      {regionOf(cap), Tiling{Diameter: 2 * degree, Overlap: 0.1}},
		"rectangles in a box":   {regionOf(box), Tiling{Width: 2 * degree, Height: 1 * degree}},
		"rectangles at a pole":  {regionOf(Cap{Centre: Direction(0, math.Pi/2), Radius: 5 * degree}), Tiling{Width: 1.5 * degree, Height: 1.5 * degree}},
		"one field for a speck": {regionOf(Cap{Centre: Direction(1, 1), Radius: 0.001 * degree}), Tiling{Diameter: degree}},
	} {
		fields := tiled(t, tt.r, tt.t)
		all := 0
		rows, err := tt.t.rows()
		if err != nil {
			t.Fatal(err)
		}
		for _, row := range rows {
			for k := range row.count {
				if tt.r.meets(Circle{Direction(2*math.Pi*(float64(k)+row.shift)/float64(row.count), row.dec), tt.t.reach()}, 5) {
					all++
				}
			}
		}
		missed, tried := 0, 0
		for range points {
			v := randomNear(rng, tt.r)
			if !tt.r.Holds(v) {
				continue
			}
			tried++
			held := false
			for i := range fields {
				if held = tt.t.holds(&fields[i], v, -1e-12); held {
					break
				}
			}
			if !held {
				missed++
			}
		}
		t.Logf("%s: %d of %d fields left, %d points tried", name, len(fields), all, tried)
		if missed > 0 || tried < points/20 {
			t.Errorf("%s: %d of %d points lie in no field", name, missed, tried)
		}
		if len(fields) > all || strings.HasSuffix(name, "box") && len(fields) == all {
			t.Errorf("%s: %d of %d fields are left; want those on the edge that others do for left out", name, len(fields), all)
		}
		if name == "one field for a speck" && len(fields) != 1 {
			t.Errorf("%s: %d fields", name, len(fields))
		}
	}
}

// randomNear draws a direction about a region's first part.
func randomNear(rng *rand.Rand, r *Region) ephemeris.Vec {
	switch s := r.Parts[0].Shape.(type) {
	case Cap:
		return moved(s.Centre, s.Radius*math.Sqrt(rng.Float64()), rng.Float64()*2*math.Pi)
	default:
		return Direction((349+27*rng.Float64())*degree, (19+12*rng.Float64())*degree)
	}
}

// TestRectanglesInRegionFiles: width and height as in a survey.
func TestRectanglesInRegionFiles(t *testing.T) {
	read := func(text string) (*Plan, string) {
		p, issues := Parse("r.yaml", []byte(text), nil)
		all := ""
		for i := range issues {
			all += issues[i].String() + "\n"
		}
		return p, all
	}
	p, issues := read("field_of_view_deg: {width: 2, height: 1.5}\nparts: [{sky: all}]\n")
	if p == nil || math.Abs(p.Width-2*degree) > 1e-15 || math.Abs(p.Height-1.5*degree) > 1e-15 || p.Diameter != 0 {
		t.Fatalf("%+v: %s", p, issues)
	}
	for text, want := range map[string]string{
		"field_of_view_deg: {width: 2}\nparts: [{sky: all}]\n":                      "height",
		"field_of_view_deg: {width: 2, height: 100}\nparts: [{sky: all}]\n":         "89",
		"field_of_view_deg: {width: 2, height: 1, depth: 3}\nparts: [{sky: all}]\n": "depth",
		"field_of_view_deg: [2, 1]\nparts: [{sky: all}]\n":                          "field_of_view_deg",
	} {
		if p, issues := read(text); p != nil || !strings.Contains(issues, want) {
			t.Errorf("%q: %v %q; want %q", text, p, issues, want)
		}
	}
	if _, err := (Tiling{Width: 2, Height: 1}).Fields(context.Background(), regionOf(wholeSphere)); err == nil || !strings.Contains(err.Error(), "90 deg") {
		t.Errorf("fields of 115 deg: %v", err)
	}
}
