package footprint

import (
	"math"

	"nightwright/visibility/ephemeris"
)

// Part is one named part of a region.
type Part struct {
	Name    string
	Line    int // where it stands in the region file
	Weight  float64
	Program string
	Shape   Shape
}

// Region is a part of the sky: all that lies in one of Parts and in none of
// Exclude.
type Region struct {
	Parts   []Part
	Exclude []Part
}

// Holds reports whether a direction is in the region.
func (r *Region) Holds(v ephemeris.Vec) bool {
	return r.PartAt(v) >= 0 && !r.excluded(v)
}

func (r *Region) excluded(v ephemeris.Vec) bool {
	for i := range r.Exclude {
		if r.Exclude[i].Shape.Holds(v) {
			return true
		}
	}
	return false
}

// PartAt returns the part that a direction belongs to, -1 when there is none:
// of those that hold it the one of the greatest weight, and the first of
// equals. Exclusions don't count.
func (r *Region) PartAt(v ephemeris.Vec) int {
	best := -1
	for i := range r.Parts {
		if (best < 0 || r.Parts[i].Weight > r.Parts[best].Weight) && r.Parts[i].Shape.Holds(v) {
			best = i
		}
	}
	return best
}

// Place says how a cap stands to the region.
func (r *Region) Place(v ephemeris.Vec, radius float64) Place {
	at := Apart
	for i := range r.Parts {
		if at = max(at, r.Parts[i].Shape.Place(v, radius)); at == Within {
			break
		}
	}
	for i := range r.Exclude {
		if at == Apart {
			break
		}
		switch r.Exclude[i].Shape.Place(v, radius) {
		case Within:
			return Apart
		case Across:
			at = Across
		}
	}
	return at
}

const (
	// areaOrder is the order of the smallest cells that Area looks at: 0.029 deg.
	areaOrder = 11
	// areaCells bounds how many cells Area looks at in one order: a region
	// with a ragged edge is looked at less closely.
	areaCells = 120_000
	// areaSamples is the number of sample points of a cell on the edge.
	areaSamples = 8
)

// Area is the region's area, sr: of one shape alone by its closed form, else
// by whole cells where they lie inside and sample points where the edge goes
// through; good to 3e-5 sr for edges once round the sky, better for short
// ones, and to a thousandth for the most ragged.
func (r *Region) Area() float64 {
	if len(r.Parts) == 1 && len(r.Exclude) == 0 {
		return r.Parts[0].Shape.Area()
	}
	return r.areaByCells()
}

// Nothing reports whether no point of the region could be found: the same
// search as Area's, up to the first point.
func (r *Region) Nothing() bool { return r.search(true) == 0 }

func (r *Region) areaByCells() float64 { return r.search(false) }

// search adds up the region's area, or just finds some of it.
func (r *Region) search(some bool) float64 {
	area, order := 0.0, 0
	var edge, next []Cell
	for face := range int64(12) {
		next = append(next, Cell{0, face})
	}
	for ; ; order++ {
		edge = edge[:0]
		for _, c := range next {
			switch r.Place(c.Centre(), cellReach[order]) {
			case Within:
				area += CellArea(order)
			case Across:
				edge = append(edge, c)
			}
		}
		if some && area > 0 || order == areaOrder || 4*len(edge) > areaCells {
			break
		}
		next = next[:0]
		for _, c := range edge {
			for k := range int64(4) {
				next = append(next, Cell{c.Order + 1, c.Index*4 + k})
			}
		}
	}
	hits, seen := 0, 0
	for _, c := range edge {
		for range areaSamples {
			// Two-dimensional golden steps: even over the cells of an edge,
			// and in no step with their rows.
			seen++
			x := math.Mod(0.7548776662466927*float64(seen), 1)
			y := math.Mod(0.5698402909980532*float64(seen), 1)
			if r.Holds(c.Point(x, y)) {
				hits++
			}
		}
		if some && hits > 0 {
			break
		}
	}
	return area + float64(hits)*CellArea(order)/areaSamples
}

// meets reports whether a circle may have a point in the region. No is
// proven; yes means that a point was found, or that at a 64th of the radius
// it still can't be ruled out.
func (r *Region) meets(c Circle, depth int) bool {
	switch r.Place(c.Centre, c.Radius) {
	case Apart:
		return false
	case Within:
		return true
	}
	if depth == 0 || r.Holds(c.Centre) {
		return true
	}
	// A disc is covered by seven of half its radius: one in the middle, six
	// round it at sqrt(3)/2. The little over makes up for the sphere.
	e := perpendicular(c.Centre)
	n := c.Centre.Cross(e)
	half := c.Radius * 0.52
	if c.Radius > 0.3 { // too curved for that: look closer from the start
		return true
	}
	if r.meets(Circle{c.Centre, half}, depth-1) {
		return true
	}
	sd, cd := math.Sincos(c.Radius * math.Sqrt(3) / 2)
	for k := range 6 {
		s, co := math.Sincos(float64(k) * math.Pi / 3)
		at := c.Centre.Scale(cd).Add(e.Scale(sd * co)).Add(n.Scale(sd * s)).Unit()
		if r.meets(Circle{at, half}, depth-1) {
			return true
		}
	}
	return false
}

// perpendicular returns a unit vector at a right angle to v: east, or at a
// pole any.
func perpendicular(v ephemeris.Vec) ephemeris.Vec {
	e := ephemeris.Vec{-v[1], v[0], 0}
	if e.Norm() < 1e-12 {
		return ephemeris.Vec{0, 1, 0}
	}
	return e.Unit()
}
