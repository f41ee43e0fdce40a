package visibility

import "math"

// AboveWords returns the number of words a field's row takes in Above.
func (h *Horizons) AboveWords() int { return (h.Len() + 63) / 64 }

// Above sets, for fields first..last-1, a bit for each slot at which the sine
// of the airless topocentric altitude is at least sinLimit: AboveWords words a
// field, slot k is bit k%64 of word k/64, bits beyond the last slot are 0.
//
// The comparison z.c (1 - vd e.c) >= L is done as (z - L vd e).c >= L, the
// same to 1e-12 where it matters, which folds diurnal aberration into the
// slots. Bits are right to 0.03" of altitude; who needs a decision nearer to
// the limit asks Exact.
func (d *Directions) Above(h *Horizons, sinLimit float64, first, last int, bits []uint64) {
	n, words := h.Len(), h.AboveWords()
	if n == 0 {
		return
	}
	// Axes of the comparison but for the constant sin lat, padded to whole groups.
	padded := (n + groupSlots - 1) / groupSlots * groupSlots
	axes := make([]float64, 2*padded)
	a, b := axes[:padded], axes[padded:]
	for k := range n {
		a[k] = h.cosLat*h.cos[k] + sinLimit*h.vd*h.sin[k]
		b[k] = h.cosLat*h.sin[k] - sinLimit*h.vd*h.cos[k]
	}
	group := h.group()
	// No height changes by more than this between a group's fifth slot and any
	// other of it, for a direction of declination 0; the horizon turns by 2 pi
	// in a sidereal day of 86164 s, 1e-6 is for what the directions drift.
	swing := (h.cosLat+1e-5)*4*math.Abs(h.Step)*2*math.Pi/86164 + 1e-6
	used := ^uint64(0)
	if n%64 != 0 {
		used = 1<<(n%64) - 1
	}
	for i := first; i < last; i++ {
		tr := d.track(h, i)
		// From here on z is the limit less the part that doesn't turn.
		tr.z = sinLimit - h.sinLat*tr.z
		tr.dz *= -h.sinLat
		row := bits[(i-first)*words : (i-first+1)*words]
		if group == groupSlots {
			tr.above8(a, b, row, math.Hypot(tr.x, tr.y)*swing)
		} else {
			tr.above(a, b, row, group)
		}
		row[words-1] &= used
	}
}

// above8 compares eight slots a pass: by one of them when that is further
// from the limit than reach, else each. A sign bit says below.
func (tr track) above8(a, b []float64, row []uint64, reach float64) {
	x, y, z := tr.x, tr.y, tr.z
	for w := range row {
		var word uint64
		for g := 0; g < 64 && len(a) >= 8 && len(b) >= 8; g += 8 {
			p, q := (*[8]float64)(a), (*[8]float64)(b)
			a, b = a[8:], b[8:]
			if over := p[4]*x + q[4]*y - z; over > reach {
				word |= 0xff << (g & 63)
			} else if over >= -reach {
				word |= compare8(p, q, x, y, z) << (g & 63)
			}
			x += tr.dx
			y += tr.dy
			z += tr.dz
		}
		row[w] = word
	}
}

// compare8 returns a bit for each of eight slots.
func compare8(p, q *[8]float64, x, y, z float64) uint64 {
	lo := math.Float64bits(p[0]*x+q[0]*y-z)>>63 |
		math.Float64bits(p[1]*x+q[1]*y-z)>>63<<1 |
		math.Float64bits(p[2]*x+q[2]*y-z)>>63<<2 |
		math.Float64bits(p[3]*x+q[3]*y-z)>>63<<3
	hi := math.Float64bits(p[4]*x+q[4]*y-z)>>63 |
		math.Float64bits(p[5]*x+q[5]*y-z)>>63<<1 |
		math.Float64bits(p[6]*x+q[6]*y-z)>>63<<2 |
		math.Float64bits(p[7]*x+q[7]*y-z)>>63<<3
	return (lo | hi<<4) ^ 0xff
}

// above is the same in groups of 1, 2 or 4 slots.
func (tr *track) above(a, b []float64, row []uint64, group int) {
	for w := range row {
		var word uint64
		for k := range min(64, len(a)-64*w) {
			if a[64*w+k]*tr.x+b[64*w+k]*tr.y >= tr.z {
				word |= 1 << k
			}
			if (k+1)%group == 0 {
				tr.step()
			}
		}
		row[w] = word
	}
}
