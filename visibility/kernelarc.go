package visibility

import "math"

// Arc functions by tables of parabolas, for the kernels.

const (
	arcCells = 512
	arcHalf  = arcCells / 2
	arcSplit = math.Sqrt2 / 2 // the arc sine's table ends a little beyond this
	// Cells per unit of the argument, with two to spare at each end.
	sineScale    = (arcHalf - 2) / arcSplit
	tangentScale = arcHalf - 2
	// Added to a small number, this leaves it rounded to a whole one, with
	// arcHalf plus it in the lowest bits: cheaper than conversions.
	arcRound = 1<<52 + arcHalf
)

// cell is a parabola in the distance from the cell's middle, in units of its
// width; cell i is about (i - arcHalf) / scale.
type cell [3]float64

var sineCells, tangentCells = newArcCells()

// newArcCells expands arc sine and arc tangent in every cell.
func newArcCells() (sine, tangent [arcCells]cell) {
	for i := 1; i < arcCells; i++ {
		w := 1 / float64(sineScale)
		x := float64(i-arcHalf) * w
		r := math.Sqrt(1 - x*x)
		sine[i] = cell{math.Asin(x), w / r, w * w * x / (2 * r * r * r)}
		w = 1 / float64(tangentScale)
		x = float64(i-arcHalf) * w
		q := 1 + x*x
		tangent[i] = cell{math.Atan(x), w / q, -w * w * x / (q * q)}
	}
	return sine, tangent
}

// arcSine returns the arc sine of v/sineScale, good to 6e-9 rad, for v up to
// arcHalf-1 either way.
func arcSine(v float64) float64 {
	r := v + arcRound
	d := v - (r - arcRound)
	c := &sineCells[math.Float64bits(r)&(arcCells-1)]
	return c[0] + d*(c[1]+d*c[2])
}

// arcTangent returns atan x for |x| <= 1, good to 3e-9 rad, and of the sign
// of x.
func arcTangent(x float64) float64 {
	v := x * tangentScale
	r := v + arcRound
	d := v - (r - arcRound)
	c := &tangentCells[math.Float64bits(r)&(arcCells-1)]
	return c[0] + d*(c[1]+d*c[2])
}
