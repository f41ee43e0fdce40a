package ephemeris

import "math"

// Vec is a vector in three dimensions; the frame and unit are the caller's.
type Vec [3]float64

// Dot returns a . b.
func (a Vec) Dot(b Vec) float64 { return a[0]*b[0] + a[1]*b[1] + a[2]*b[2] }

// Cross returns a x b.
func (a Vec) Cross(b Vec) Vec {
	return Vec{a[1]*b[2] - a[2]*b[1], a[2]*b[0] - a[0]*b[2], a[0]*b[1] - a[1]*b[0]}
}

// Add returns a + b.
func (a Vec) Add(b Vec) Vec { return Vec{a[0] + b[0], a[1] + b[1], a[2] + b[2]} }

// Sub returns a - b.
func (a Vec) Sub(b Vec) Vec { return Vec{a[0] - b[0], a[1] - b[1], a[2] - b[2]} }

// Scale returns k a.
func (a Vec) Scale(k float64) Vec { return Vec{k * a[0], k * a[1], k * a[2]} }

// Norm returns the length of a.
func (a Vec) Norm() float64 { return math.Sqrt(a.Dot(a)) }

// Unit returns a / |a|; the zero vector stays zero.
func (a Vec) Unit() Vec {
	n := a.Norm()
	if n == 0 {
		return a
	}
	return a.Scale(1 / n)
}

// Mat is a matrix of three rows.
type Mat [3]Vec

// Apply returns M v.
func (m Mat) Apply(v Vec) Vec { return Vec{m[0].Dot(v), m[1].Dot(v), m[2].Dot(v)} }

// Transpose returns the transpose, which inverts a rotation.
func (m Mat) Transpose() Mat {
	return Mat{
		{m[0][0], m[1][0], m[2][0]},
		{m[0][1], m[1][1], m[2][1]},
		{m[0][2], m[1][2], m[2][2]},
	}
}

// Mul returns M N.
func (m Mat) Mul(n Mat) Mat {
	t := n.Transpose()
	return Mat{t.Apply(m[0]), t.Apply(m[1]), t.Apply(m[2])}
}
