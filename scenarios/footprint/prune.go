package footprint

import (
	"cmp"
	"context"
	"math"
	"slices"

	"nightwright/visibility/ephemeris"
)

// maxPruned is the largest reach of fields, rad, whose edge is looked at: the
// points that stand for a field are laid out as in a plane.
const maxPruned = 0.3

// holds reports whether a direction lies in a field that is smaller by a
// margin (rad) on every side.
func (t *Tiling) holds(f *Field, v ephemeris.Vec, margin float64) bool {
	keep := 1 - t.Overlap
	if t.Width > 0 {
		w, h := t.Width*keep, t.Height*keep
		// Two great circles come together away from the middle: a margin
		// there takes a larger one here.
		m := margin / math.Cos(max(w, h)/2)
		return w > 2*m && h > 2*m && rectHolds(f.Centre, v, w-2*m, h-2*m)
	}
	r := t.Diameter/2*keep - margin
	return r > 0 && f.Centre.Dot(v) >= math.Cos(r)
}

// reach is the distance from a field's centre to its furthest point, rad.
func (t *Tiling) reach() float64 {
	keep := 1 - t.Overlap
	if t.Width > 0 {
		return math.Atan(math.Hypot(math.Tan(t.Width*keep/2), math.Tan(t.Height*keep/2)))
	}
	return t.Diameter / 2 * keep
}

// pruned leaves out fields on the region's edge whose part of it others hold
// as well; what remains has no gap either. base is sorted by declination.
//
// The proof: points lie so close that every point of a field is within step of
// one. Where each of them that is within step of the region lies in another
// field made smaller by step, every point of the region in this one lies in
// another.
func (t *Tiling) pruned(ctx context.Context, base []Field, r *Region) ([]Field, error) {
	reach := t.reach()
	if reach > maxPruned {
		return base, nil
	}
	step := reach / 16
	type edge struct {
		at     int
		points []ephemeris.Vec
	}
	var edges []edge
	for i := range base {
		if i%256 == 0 && ctx.Err() != nil {
			return nil, ctx.Err()
		}
		if r.Place(base[i].Centre, reach+step) == Within {
			continue
		}
		e := edge{at: i}
		for _, p := range t.lattice(&base[i], reach, step) {
			if r.Place(p, step) != Apart {
				e.points = append(e.points, p)
			}
		}
		edges = append(edges, e)
	}
	// Those that hold the least of the region go first.
	slices.SortStableFunc(edges, func(a, b edge) int { return cmp.Compare(len(a.points), len(b.points)) })
	gone := make([]bool, len(base))
	for k, e := range edges {
		if k%64 == 0 && ctx.Err() != nil {
			return nil, ctx.Err()
		}
		gone[e.at] = t.spare(base, gone, e.at, e.points, reach, step)
	}
	out := make([]Field, 0, len(base))
	for i := range base {
		if !gone[i] {
			out = append(out, base[i])
		}
	}
	if len(out) == 0 { // a region smaller than the steps
		return base, nil
	}
	return out, nil
}

// spare is true when other fields that are still there hold all the points.
func (t *Tiling) spare(base []Field, gone []bool, at int, points []ephemeris.Vec, reach, step float64) bool {
	from, _ := slices.BinarySearchFunc(base, base[at].Dec-2*reach-step, func(f Field, dec float64) int { return cmp.Compare(f.Dec, dec) })
	var near []int
	for i := from; i < len(base) && base[i].Dec <= base[at].Dec+2*reach+step; i++ {
		if i != at && !gone[i] && base[i].Centre.Dot(base[at].Centre) >= math.Cos(2*reach+step) {
			near = append(near, i)
		}
	}
	for _, p := range points {
		held := false
		for k, i := range near {
			if t.holds(&base[i], p, step) {
				held = true
				near[0], near[k] = near[k], near[0] // it holds the next point, too, as like as not
				break
			}
		}
		if !held {
			return false
		}
	}
	return true
}

// lattice lays points over a field: a hexagonal pattern in which none of its
// points is further than step from one.
func (t *Tiling) lattice(f *Field, reach, step float64) []ephemeris.Vec {
	e := perpendicular(f.Centre)
	n := f.Centre.Cross(e)
	wide := step * math.Sqrt(3) * 0.98 // a hexagonal pattern's holes are wide / sqrt 3 deep (common practice)
	high := wide * math.Sqrt(3) / 2
	rows := int((reach+step)/high) + 1
	var out []ephemeris.Vec
	for j := -rows; j <= rows; j++ {
		y := float64(j) * high
		for k := -rows - 1; k <= rows+1; k++ {
			x := (float64(k) + float64(j&1)/2) * wide
			d := math.Hypot(x, y)
			if d > reach+step {
				continue
			}
			// The distance from the centre is kept: points come closer to each
			// other on the sphere than in the plane, never further apart.
			s, c := math.Sincos(d)
			if d == 0 {
				out = append(out, f.Centre)
				continue
			}
			out = append(out, f.Centre.Scale(c).Add(e.Scale(s*x/d)).Add(n.Scale(s*y/d)).Unit())
		}
	}
	return out
}
