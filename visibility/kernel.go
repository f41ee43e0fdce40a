package visibility

import (
	"math"

	"nightwright/visibility/ephemeris"
)

// Kernels that fill whole grids, fields x slots of one site, on one core. The
// slow part (aberration, deflection, precession-nutation) is done twice per
// field and span and taken as linear between; only the Earth's rotation is
// done for each slot. Arrays are kept apart by component, so that the inner
// loops read them in order and without bounds checks.

// Directions are the apparent geocentric places of many fields over a span of
// time, in the intermediate frame of date, linear between its two ends. Over
// 24 h the line is off by under 0.01" (TestKernelAltAz).
type Directions struct {
	From, To   float64   // UTC, Unix s
	x, y, z    []float64 // at From
	dx, dy, dz []float64 // change over the span
}

// NewDirections computes the fields' places at the two ends of a span (UTC,
// Unix s; at most 26 h for the error given at Directions).
func NewDirections(e *Exact, positions []Position, from, to float64) *Directions {
	n := len(positions)
	d := &Directions{From: from, To: to}
	all := make([]float64, 6*n)
	part := func(i int) []float64 { return all[i*n : (i+1)*n : (i+1)*n] }
	d.x, d.y, d.z, d.dx, d.dy, d.dz = part(0), part(1), part(2), part(3), part(4), part(5)
	at := make([]ephemeris.Vec, 2*n)
	apparent(e.clock, positions, from, at[:n])
	apparent(e.clock, positions, to, at[n:])
	for i := range n {
		u, v := at[i], at[n+i]
		d.x[i], d.y[i], d.z[i] = u[0], u[1], u[2]
		d.dx[i], d.dy[i], d.dz[i] = v[0]-u[0], v[1]-u[1], v[2]-u[2]
	}
	return d
}

// Len returns the number of fields.
func (d *Directions) Len() int { return len(d.x) }

// Horizons is one site's horizon at equally spaced instants.
type Horizons struct {
	Start, Step    float64   // UTC, Unix s; s
	sin, cos       []float64 // of the local Earth rotation angle
	sinLat, cosLat float64
	vd             float64 // diurnal aberration: rotation speed over c
}

// NewHorizons turns a site's horizon to n instants.
func NewHorizons(e *Exact, s Site, start, step float64, n int) *Horizons {
	h := &Horizons{Start: start, Step: step, vd: rotationSpeed(s)}
	h.sin, h.cos = make([]float64, n), make([]float64, n)
	h.sinLat, h.cosLat = math.Sincos(s.Latitude)
	for k := range n {
		h.sin[k], h.cos[k] = math.Sincos(e.clock.ERA(start+float64(k)*step) + s.Longitude)
	}
	return h
}

// Len returns the number of slots.
func (h *Horizons) Len() int { return len(h.sin) }

// A direction stands still for a group of slots, of together at most 80 min,
// in which aberration and nutation move it by 0.03" at most: 0.015" either way.
const (
	groupSlots = 8
	groupTime  = 4800 // s
)

// group returns how many slots share a direction: 8, 4, 2 or 1.
func (h *Horizons) group() int {
	g := groupSlots
	for g > 1 && float64(g)*math.Abs(h.Step) > groupTime {
		g /= 2
	}
	return g
}

// track is one field's direction in the middle of the first group of slots
// and its change from group to group.
type track struct{ x, y, z, dx, dy, dz float64 }

// track returns a field's track over the slots.
func (d *Directions) track(h *Horizons, field int) track {
	span, g := d.To-d.From, float64(h.group())
	f := (h.Start + h.Step*(g-1)/2 - d.From) / span
	df := g * h.Step / span
	return track{
		x: d.x[field] + f*d.dx[field], y: d.y[field] + f*d.dy[field], z: d.z[field] + f*d.dz[field],
		dx: df * d.dx[field], dy: df * d.dy[field], dz: df * d.dz[field],
	}
}

// AltAz fills altitude and azimuth (rad; airless, topocentric, north 0, east
// 90 deg, [0, 2 pi)) of fields first..last-1 at every slot, a row of Len slots
// a field. Within 0.03" on the sky of Exact more than 10 deg from the Sun.
func (d *Directions) AltAz(h *Horizons, first, last int, altitude, azimuth []float64) {
	n := h.Len()
	for i := first; i < last; i++ {
		row := (i - first) * n
		d.track(h, i).altAz(h, altitude[row:row+n], azimuth[row:row+n])
	}
}

// altAz fills one field's row, group by group; groups of less than 8 slots go
// through a block of 8.
func (tr track) altAz(h *Horizons, altitude, azimuth []float64) {
	sin, cos := h.sin, h.cos
	if h.group() == groupSlots {
		for len(sin) >= 8 && len(cos) >= 8 && len(altitude) >= 8 && len(azimuth) >= 8 {
			h.altAz(&tr, (*[8]float64)(sin), (*[8]float64)(cos), (*[8]float64)(altitude), (*[8]float64)(azimuth))
			sin, cos, altitude, azimuth = sin[8:], cos[8:], altitude[8:], azimuth[8:]
			tr.step()
		}
	}
	for len(sin) > 0 {
		g := min(h.group(), len(sin))
		var si, co, alt, az [8]float64
		copy(si[:g], sin)
		copy(co[:g], cos)
		h.altAz(&tr, &si, &co, &alt, &az)
		copy(altitude, alt[:g])
		copy(azimuth, az[:g])
		sin, cos, altitude, azimuth = sin[g:], cos[g:], altitude[g:], azimuth[g:]
		tr.step()
	}
}

// step moves a track on by a group of slots.
func (tr *track) step() {
	tr.x += tr.dx
	tr.y += tr.dy
	tr.z += tr.dz
}

// belowTurn is the last float64 below 2 pi, so that an azimuth stays below it.
var belowTurn = math.Nextafter(2*math.Pi, 0)

// altAz is the inner loop: one direction at eight slots. Along a row the
// quadrant changes rarely, so that the branches cost next to nothing. Heights
// are in cells of the arc sine's table.
func (h *Horizons) altAz(tr *track, sin, cos, altitude, azimuth *[8]float64) {
	const split = arcSplit * sineScale
	x, y, vd := tr.x, tr.y, h.vd
	north, sinLat := tr.z*h.cosLat, h.sinLat
	above, cosLat := tr.z*h.sinLat*sineScale, h.cosLat*sineScale
	for k := range sin {
		s, c := sin[k], cos[k]
		p := c*x + s*y
		u := c*y - s*x + vd // east
		n := north - sinLat*p
		up := above + cosLat*p

		// Azimuth: the arc tangent of the smaller part over the larger.
		var ratio, base float64
		uu, nn := u*u, n*n
		if uu <= nn {
			ratio = u / n
			if n < 0 {
				base = math.Pi
			} else if u < 0 {
				base = belowTurn
			} else if n == 0 { // in the very zenith any azimuth will do
				ratio = 0
			}
		} else {
			ratio = -n / u
			base = math.Pi / 2
			if u < 0 {
				base = 3 * math.Pi / 2
			}
		}
		azimuth[k] = base + arcTangent(ratio)

		// Altitude: the arc sine of the height, or of the distance from the
		// zenith when that is smaller; (east, north, up) is 1 + vd u long.
		up -= up * vd * u
		if up*up <= split*split {
			altitude[k] = arcSine(up)
			continue
		}
		off := arcSine(math.Sqrt(uu+nn) * (sineScale - sineScale*vd*u))
		if up > 0 {
			altitude[k] = math.Pi/2 - off
		} else {
			altitude[k] = off - math.Pi/2
		}
	}
}
