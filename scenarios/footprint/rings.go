package footprint

import "math"

// ring is one row of circles at a declination: count of them, evenly spaced,
// the first at right ascension shift times the spacing.
type ring struct {
	dec   float64
	count int
	shift float64 // 0 or 0.5
}

// The whole sky is covered by rows of circles of constant declination, from
// the equator to either pole. Rows in a stack have the same number of circles
// and are staggered by half a spacing, like tiles of a roof: a hexagonal
// pattern, squeezed sideways as the parallels get shorter. Squeezing costs
// little (from 1.9 to 1.4 radii between neighbours, a twentieth), so a stack
// runs until a new one with fewer circles is worth the seam between the two.
// What a row leaves to the next is worked out on the sphere, not in a plane.

// cover solves for the highest declination at which circles of radius r with
// a half spacing h (rad of right ascension) between a meridian and the
// nearest centre still reach a point of declination p on the meridian. It is
// not ok when they are too far apart.
func cover(p, h, r float64) (dec float64, ok bool) {
	sp, cp := math.Sincos(p)
	x := cp * math.Cos(h)
	reach := math.Cos(r) / math.Hypot(sp, x)
	if reach > 1 {
		return 0, false
	}
	return math.Atan2(sp, x) + math.Acos(reach), true
}

// stacks are the choices that stackRings takes.
type stacks struct {
	wide   float64 // spacing of a new stack's first row, in radii
	narrow float64 // spacing under which a stack ends, in radii
}

// half returns the rows from the equator to the north pole, for circles of
// radius r; each row covers, with those before it, everything up to where the
// next begins. It is not ok when the choices can't cover.
func half(r float64, s stacks) (rows []ring, ok bool) {
	spacing := func(dec float64, n int) float64 { return 2 * math.Pi * math.Cos(dec) / float64(n) }
	countAt := func(dec, wide float64) int {
		return max(3, int(math.Ceil(2*math.Pi*math.Cos(dec)/(wide*r))))
	}
	dec, n, shift := 0.0, countAt(0, s.wide), 0.0
	if math.Pi/float64(n) >= r { // the equator's own gaps stay open
		return nil, false
	}
	for {
		rows = append(rows, ring{dec, n, shift})
		h := math.Pi / float64(n)
		gap, ok := cover(dec, h, r) // between two circles, covered up to here
		if !ok {
			return nil, false
		}
		if gap >= math.Pi/2 { // the row closes over the pole
			return rows, true
		}
		if dec+r >= math.Pi/2 && gap+r >= math.Pi/2 { // one more circle closes the pole
			return append(rows, ring{math.Pi / 2, 1, 0}), true
		}
		next, fits := 0.0, false
		if spacing(dec, n) > s.narrow*r {
			// Staggered: the next row's circle stands over the gap, its gap
			// over this row's circle.
			a, ok := cover(dec+r, h, r)
			if ok && dec+r < math.Pi/2 {
				next, fits = min(a, gap+r), true
			}
		}
		if fits && next < math.Pi/2 && next > dec {
			dec, shift = next, 0.5-shift
			continue
		}
		// A seam: rows of different counts meet gap to gap somewhere.
		if gap+r >= math.Pi/2 {
			return append(rows, ring{math.Pi / 2, 1, 0}), true
		}
		// The count follows from where the row will stand, which follows from
		// the count: the smallest that fits its own place.
		m := countAt(min(gap+r, math.Pi/2), s.wide)
		for ; ; m++ {
			if m > 4*n+8 {
				return nil, false
			}
			a, ok := cover(gap, math.Pi/float64(m), r)
			if ok && a > gap && spacing(a, m) <= s.wide*r {
				dec, n, shift = a, m, 0
				break
			}
		}
	}
}

// count is the number of circles of the whole sky with these northern rows.
func total(rows []ring) int {
	n := 0
	for i, r := range rows {
		n += r.count
		if i > 0 {
			n += r.count
		}
	}
	return n
}

// wholeSky returns rows from south to north that cover the whole sky with
// circles of radius r (rad, at most a quarter turn), by the choices that need
// the fewest.
func wholeSky(r float64) []ring {
	var best []ring
	for wide := 1.40; wide < 1.97; wide += 0.02 {
		for narrow := 1.0; narrow < 1.75; narrow += 0.03 {
			if rows, ok := half(r, stacks{wide, narrow}); ok && (best == nil || total(rows) < total(best)) {
				best = rows
			}
		}
	}
	var sky []ring
	for i := len(best) - 1; i > 0; i-- {
		south := best[i]
		south.dec = -south.dec
		sky = append(sky, south)
	}
	return append(sky, best...)
}
