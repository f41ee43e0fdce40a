package footprint

import (
	"math"

	"nightwright/visibility/ephemeris"
)

// MaxOrder is the deepest HEALPix order: 12 * 4^29 cells fill 62 bits.
const MaxOrder = 29

// Cell is one HEALPix cell in the nested numbering: order 0..29, index
// 0 .. 12*4^order - 1. Its children at the next order are 4*Index ..
// 4*Index+3, so all cells below it at order 29 are one range.
//
// Source: Gorski et al. 2005, ApJ 622, 759, sections 5 and A.
type Cell struct {
	Order int
	Index int64
}

// CellCount is the number of cells of an order.
func CellCount(order int) int64 { return 12 << (2 * order) }

// CellArea is the area of every cell of an order, sr.
func CellArea(order int) float64 { return 4 * math.Pi / float64(CellCount(order)) }

// CellSize is the square root of CellArea, rad.
func CellSize(order int) float64 { return math.Sqrt(CellArea(order)) }

// Rows of base cells: where the southernmost corner of each of the twelve
// stands, in units of a quarter of the projected plane's height and of an
// eighth of a turn.
var (
	baseRow    = [12]float64{2, 2, 2, 2, 3, 3, 3, 3, 4, 4, 4, 4}
	baseColumn = [12]float64{1, 3, 5, 7, 0, 2, 4, 6, 1, 3, 5, 7}
)

// CellAt returns the cell of an order that holds a direction (a unit vector).
// On an edge it is one of the cells that meet there.
func CellAt(order int, v ephemeris.Vec) Cell {
	side := int64(1) << order
	n := float64(side)
	turn := math.Atan2(v[1], v[0]) / (math.Pi / 2) // quarters of a turn
	if turn < 0 {
		turn += 4
	}
	if turn >= 4 {
		turn = 0
	}
	z := v[2]
	var face, x, y int64
	if math.Abs(z) <= 2.0/3 {
		up, down := n*(0.5+turn), n*z*0.75
		p, m := int64(up-down), int64(up+down) // lines that rise, lines that fall
		fp, fm := p>>order, m>>order
		switch {
		case fp == fm:
			face = fp&3 + 4
		case fp < fm:
			face = fp & 3
		default:
			face = fm&3 + 8
		}
		x, y = m&(side-1), side-p&(side-1)-1
	} else {
		quarter := min(3, int64(turn))
		part := turn - float64(quarter)
		// n sqrt(3 (1 - |z|)), from the distance to the axis: exact at the poles.
		r := n * math.Sqrt(3/(1+math.Abs(z))) * math.Hypot(v[0], v[1])
		p := min(side-1, int64(part*r))
		m := min(side-1, int64((1-part)*r))
		if z > 0 {
			face, x, y = quarter, side-m-1, side-p-1
		} else {
			face, x, y = quarter+8, p, m
		}
	}
	return Cell{order, face<<(2*order) | spread(x) | spread(y)<<1}
}

// Point returns the direction of a place inside a cell: x and y run from 0 to
// 1 along its two edges from the southern corner, x to the north-east and y
// to the north-west. Equal areas of x and y are equal areas of sky.
func (c Cell) Point(x, y float64) ephemeris.Vec {
	in := c.Index & (int64(1)<<(2*c.Order) - 1)
	face := c.Index >> (2 * c.Order)
	scale := 1 / float64(int64(1)<<c.Order)
	fx, fy := (float64(gather(in))+x)*scale, (float64(gather(in>>1))+y)*scale
	row := baseRow[face] - fx - fy
	ring, z, sine := 1.0, 0.0, 0.0
	switch {
	case row < 1:
		ring = row
		z = 1 - ring*ring/3
		sine = ring * math.Sqrt((1+z)/3)
	case row > 3:
		ring = 4 - row
		z = ring*ring/3 - 1
		sine = ring * math.Sqrt((1-z)/3)
	default:
		z = (2 - row) * 2 / 3
		sine = math.Sqrt(1 - z*z)
	}
	if ring <= 0 { // a pole
		return ephemeris.Vec{0, 0, math.Copysign(1, z)}
	}
	s, co := math.Sincos(math.Pi / 4 * (baseColumn[face]*ring + fx - fy) / ring)
	return ephemeris.Vec{sine * co, sine * s, z}
}

// Centre returns the direction of a cell's centre.
func (c Cell) Centre() ephemeris.Vec { return c.Point(0.5, 0.5) }

// Corners returns the directions of a cell's corners: south, east, north,
// west.
func (c Cell) Corners() [4]ephemeris.Vec {
	return [4]ephemeris.Vec{c.Point(0, 0), c.Point(1, 0), c.Point(1, 1), c.Point(0, 1)}
}

// cellReach[order] is a bound, rad, on how far any point of a cell stands from
// the cell's centre: the distance from the centre to a corner of the most
// stretched cell of the order (those at the corner of a polar cap, where z =
// 2/3), with a little over for rounding.
var cellReach = func() (reach [MaxOrder + 1]float64) {
	for order := range reach {
		n := float64(int64(1) << order)
		s, c := math.Sincos(math.Pi / (4 * n))
		equator := math.Sqrt(1 - 4.0/9)
		a := ephemeris.Vec{equator * c, equator * s, 2.0 / 3}
		t := (1 - 1/n) * (1 - 1/n)
		z := 1 - t/3
		b := ephemeris.Vec{math.Sqrt(1 - z*z), 0, z}
		reach[order] = separation(a, b)*(1+1e-9) + 1e-15
	}
	return reach
}()

// spread puts the bits of a number below 2^29 at the even places.
func spread(v int64) int64 {
	v = (v | v<<16) & 0x0000ffff0000ffff
	v = (v | v<<8) & 0x00ff00ff00ff00ff
	v = (v | v<<4) & 0x0f0f0f0f0f0f0f0f
	v = (v | v<<2) & 0x3333333333333333
	return (v | v<<1) & 0x5555555555555555
}

// gather takes the bits at the even places; the inverse of spread.
func gather(v int64) int64 {
	v &= 0x5555555555555555
	v = (v | v>>1) & 0x3333333333333333
	v = (v | v>>2) & 0x0f0f0f0f0f0f0f0f
	v = (v | v>>4) & 0x00ff00ff00ff00ff
	v = (v | v>>8) & 0x0000ffff0000ffff
	return (v | v>>16) & 0x00000000ffffffff
}

// Direction returns the unit vector of a right ascension and declination, rad.
func Direction(ra, dec float64) ephemeris.Vec {
	sa, ca := math.Sincos(ra)
	sd, cd := math.Sincos(dec)
	return ephemeris.Vec{cd * ca, cd * sa, sd}
}

// Angles returns right ascension in [0, 2 pi) and declination of a vector.
func Angles(v ephemeris.Vec) (ra, dec float64) {
	ra = math.Atan2(v[1], v[0])
	if ra < 0 {
		ra += 2 * math.Pi
	}
	if ra >= 2*math.Pi { // a tiny negative angle rounds up to a whole turn
		ra = 0
	}
	return ra, math.Atan2(v[2], math.Hypot(v[0], v[1]))
}

// separation is the angle between two unit vectors, good at all angles.
func separation(a, b ephemeris.Vec) float64 {
	return math.Atan2(a.Cross(b).Norm(), a.Dot(b))
}
