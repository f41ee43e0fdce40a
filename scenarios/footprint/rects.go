package footprint

import (
	"math"

	"nightwright/visibility/ephemeris"
)

// A rectangular field is the part of the sky whose gnomonic projection about
// its centre, north up, is a rectangle: its edges are great circles at half
// the width and half the height from the centre. Rows of one declination
// cover the sky from the equator to either pole, edge to edge along the
// centres; towards a pole a row has fewer fields, and what the great circles
// leave open between two neighbours the next row takes over. What a row
// covers is worked out on the sphere.

// rectHolds reports whether a direction lies in a rectangular field, and
// how far its edges reach: width and height in rad.
func rectHolds(centre, v ephemeris.Vec, width, height float64) bool {
	east, north, up := tangent(centre, v)
	return up > 0 && math.Abs(east) <= math.Tan(width/2)*up && math.Abs(north) <= math.Tan(height/2)*up
}

// tangent returns the components of v towards east, north and the centre.
func tangent(centre, v ephemeris.Vec) (east, north, up float64) {
	e := perpendicular(centre)
	return e.Dot(v), centre.Cross(e).Dot(v), centre.Dot(v)
}

// RectArea is the area of a rectangular field, sr: 4 asin(sin(w/2) sin(h/2)),
// the solid angle of a pyramid (common practice).
func RectArea(width, height float64) float64 {
	return 4 * math.Asin(math.Sin(width/2)*math.Sin(height/2))
}

// rectBand returns between which declinations a row of n rectangles at dec
// leaves no gap; not ok when its fields don't meet sideways there.
func rectBand(dec float64, n int, width, height float64) (low, high float64, ok bool) {
	half := math.Pi / float64(n)
	edge := func(d float64) (least, most float64) { // of a great circle of constant north, over a field's half
		if d >= math.Pi/2-1e-12 {
			return math.Pi / 2, math.Pi / 2
		}
		if d <= -math.Pi/2+1e-12 {
			return -math.Pi / 2, -math.Pi / 2
		}
		a, b := d, math.Atan(math.Cos(half)*math.Tan(d))
		return min(a, b), max(a, b)
	}
	_, low = edge(dec - height/2)
	high, _ = edge(dec + height/2)
	if high <= low {
		return 0, 0, false
	}
	for _, d := range []float64{low, high} {
		sd, cd := math.Sincos(d)
		s0, c0 := math.Sincos(dec)
		up := s0*sd + c0*cd*math.Cos(half)
		if up <= 0 || cd*math.Sin(half) > math.Tan(width/2)*up*(1+1e-12) {
			return 0, 0, false
		}
	}
	return low, high, true
}

// rectRow finds the fewest fields of a row at a declination that leave no gap.
func rectRow(dec, width, height float64) (row ring, low, high float64, ok bool) {
	n := max(3, int(2*math.Pi*math.Cos(math.Abs(dec)+height/2)/width))
	for ; n < 1<<22; n++ {
		if low, high, ok = rectBand(dec, n, width, height); ok {
			return ring{dec, n, 0}, low, high, true
		}
	}
	return ring{}, 0, 0, false
}

// rectSky returns rows of rectangles, from south to north, that cover the
// whole sky; nil when there are none, for fields of 90 deg and more.
func rectSky(width, height float64) []ring {
	if width >= math.Pi/2 || height >= math.Pi/2 {
		return nil
	}
	row, _, high, ok := rectRow(0, width, height)
	if !ok {
		return nil
	}
	north := []ring{row}
	for high < math.Pi/2-1e-9 {
		if math.Pi/2-high <= min(width, height)/2 { // one more closes the pole
			north = append(north, ring{math.Pi / 2, 1, 0})
			break
		}
		// The lower edge touches what is covered; the last row's upper edge the pole.
		dec := min(high+height/2, math.Pi/2-height/2)
		next, low, up, ok := rectRow(dec, width, height)
		if !ok || low > high+1e-9 || up <= high {
			return nil
		}
		north, high = append(north, next), up
	}
	var sky []ring
	for i := len(north) - 1; i > 0; i-- {
		south := north[i]
		south.dec = -south.dec
		sky = append(sky, south)
	}
	return append(sky, north...)
}
