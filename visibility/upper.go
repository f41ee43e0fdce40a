package visibility

import (
	"math"

	"nightwright/visibility/ephemeris"
)

// An upper bound on quality between frames.
//
// In a cell [t0, t0+h] of a FrameGrid, replace the sky by one that is never
// brighter: the twilight by the smallest of its values at the ends (the
// Sun's altitude is monotone in a cell unless it may culminate in it, and then
// the cell's twilight is taken as zero), the
// moonlight by none if the Moon rises or sets in the cell. What is left,
//
//	R(t) = C(s) / (D(s) + M(t) E(s) + tau),   s = sin h(t), tau constant,
//
// is smooth, and R(t) <= lerp(R(t0), R(t0+h)) + K h^2 / 8 for any K >= |R''|.
// By the chain rule, with |s'| <= omega cos h, |s''| <= omega^2 (omega: the
// Earth's rotation), and M'/M, M”/M bounded by l1, l2,
//
//	|R''| <= omega^2 (|R_ss| cos^2 h + |R_s|) + 2 omega l1 |(M R_M)_s|
//	         + l2 |M R_M| + l1^2 |M^2 R_MM|.
//
// The suprema over M and tau of the terms in s are tabulated per filter in
// bins of s (newCurvature) with neighbours folded in, because s moves by less
// than a bin in a cell; l1 and l2 in bins of the Moon's sine. Both carry a
// margin of 1.2 for what lies between the samples. Near the Moon (within 13
// deg) f(rho) is replaced by its value 3 deg further out, which is less.

// nodeFloor bounds the light of the two cells that meet in a frame from below,
// for one filter.
type nodeFloor struct {
	moon     float64 // Light.moon at the frame, 0 if the Moon is not up all through both cells
	twilight float64 // least of both cells
	l1, l2   float64 // bounds on M'/M (1/s) and M''/M (1/s^2)
}

const (
	earthRate   = 7.2921159e-5 // rad/s
	curveMargin = 1.2
	curveBins   = 48 // bins of s in 0..1
	moonBins    = 64 // bins of the Moon's sine in 0..1
)

// curvature tabulates, per filter, the suprema of the bound above.
type curvature struct {
	dark  [curveBins]float64 // omega^2 (|R_ss| cos^2 h + |R_s|)
	cross [curveBins]float64 // 2 omega |(M R_M)_s|
	moon  [moonBins][2]float64
}

// newCurvature samples R over s, moonlight and twilight.
func newCurvature(ft *filterSky) *curvature {
	var c curvature
	levels := []float64{0, 0.03, 0.1, 0.3, 1, 3, 10, 30, 100, 300, 1000}
	var dark, cross [curveBins]float64
	const d = 1e-3
	for i := range curveBins * 4 {
		s := math.Max((float64(i)+0.5)/(curveBins*4), 2*d)
		for _, m := range levels {
			for _, tau := range levels {
				r := func(s, m float64) float64 {
					row := ft.row(s)
					return row.clear / (row.dark + m*row.loss + tau)
				}
				mrm := func(s float64) float64 { // M R_M by its formula
					row := ft.row(s)
					sky := row.dark + m*row.loss + tau
					return -row.clear * m * row.loss / (sky * sky)
				}
				hi := math.Min(s+d, 1)
				lo := hi - 2*d
				mid := hi - d
				rs := (r(hi, m) - r(lo, m)) / (2 * d)
				rss := (r(hi, m) - 2*r(mid, m) + r(lo, m)) / (d * d)
				b := i / 4
				dark[b] = math.Max(dark[b], earthRate*earthRate*(math.Abs(rss)*(1-mid*mid)+math.Abs(rs)))
				cross[b] = math.Max(cross[b], 2*earthRate*math.Abs(mrm(hi)-mrm(lo))/(2*d))
			}
		}
	}
	for b := range curveBins {
		for n := max(0, b-2); n <= min(curveBins-1, b+2); n++ {
			c.dark[b] = math.Max(c.dark[b], curveMargin*dark[n])
			c.cross[b] = math.Max(c.cross[b], curveMargin*cross[n])
		}
	}
	c.setMoon(ft.k)
	return &c
}

// setMoon tabulates l1 and l2 by the Moon's sine: the Moon's own extinction
// 10^(-0.4 k X) with the Earth's rotation, plus its phase and its separation
// from the field, which move by under 1 deg an hour.
func (c *curvature) setMoon(k float64) {
	const (
		drift = 5e-6                           // rad/s: the Moon's motion with its parallax, under 1 deg/h
		fade  = math.Ln10 / 40 * 180 / math.Pi // |d ln f / d rho| per rad beyond 10 deg
		phase = 0.4 * math.Ln10 * (0.026 + 16e-9*180*180*180) * 180 / math.Pi * 4e-6
	)
	a := 0.4 * math.Ln10 * k
	var l1, l2 [moonBins]float64
	for b := range moonBins {
		for i := range 8 {
			s := (float64(b) + (float64(i)+0.5)/8) / moonBins
			x := scatterPath(s)
			d1 := 0.96 * s * x * x * x
			d2 := 0.96*x*x*x - 3*0.96*0.96*s*s*x*x*x*x*x
			u1 := a*d1*earthRate + fade*drift + phase
			u2 := a*(math.Abs(d2)+d1)*earthRate*earthRate + fade*drift*earthRate + fade*drift*drift
			l1[b] = math.Max(l1[b], u1)
			l2[b] = math.Max(l2[b], u2+u1*u1)
		}
	}
	for b := range moonBins {
		for n := max(0, b-3); n <= min(moonBins-1, b+3); n++ {
			c.moon[b][0] = math.Max(c.moon[b][0], curveMargin*l1[n])
			c.moon[b][1] = math.Max(c.moon[b][1], curveMargin*l2[n])
		}
	}
}

// row interpolates the path table.
func (ft *filterSky) row(s float64) pathRow {
	x := s * pathSteps
	k := min(max(int(x), 0), pathSteps-1)
	w := x - float64(k)
	a, b := &ft.path[k], &ft.path[k+1]
	return pathRow{a.clear + w*(b.clear-a.clear), a.dark + w*(b.dark-a.dark), a.loss + w*(b.loss-a.loss)}
}

// setNodes fills the nodes' light floors.
func (g *FrameGrid) setNodes(s *Sky) {
	n := len(g.Frames)
	g.nodes = make([]nodeFloor, n*g.filters)
	for k := range n {
		lo, hi := max(k-1, 0), min(k+1, n-1)
		up, still := true, false
		least := 1.0
		for j := lo; j <= hi; j++ {
			least = math.Min(least, g.Frames[j].SinMoon)
			if j > lo {
				up = up && staysUp(&g.Frames[j-1], &g.Frames[j])
				still = still || culminates(&g.Frames[j-1], &g.Frames[j])
			}
		}
		for f := range g.filters {
			fl := &g.nodes[k*g.filters+f]
			fl.twilight = g.Light(k, f).twilight
			for j := lo; j <= hi; j++ {
				fl.twilight = math.Min(fl.twilight, g.Light(j, f).twilight)
			}
			if still {
				fl.twilight = 0
			}
			if up {
				fl.moon = g.Light(k, f).moon
				m := s.filters[f].curve.moon[min(int(least*moonBins), moonBins-1)]
				fl.l1, fl.l2 = m[0], m[1]
			}
		}
	}
}

// culminates reports whether the Sun's altitude may turn round between two
// frames. Its sine's second derivative is at most omega^2 cos(latitude), so it
// is monotone where it changes by more than that times h^2. (The meridian is
// no guide at high latitudes: the Sun's own motion moves its lowest moment.)
func culminates(a, b *Frame) bool {
	turn := earthRate * (b.T - a.T)
	cosLat := math.Hypot(a.Zenith[0], a.Zenith[1])
	return math.Abs(a.SinSun-b.SinSun) <= turn*turn*cosLat+1e-9
}

// staysUp reports whether the Moon is up all through between two frames. At a
// culmination its sine can dip under both ends by (omega h)^2/8; it can't when
// the ends differ by so much that it is monotone in between.
func staysUp(a, b *Frame) bool {
	turn := earthRate * (b.T - a.T)
	least := math.Min(a.SinMoon, b.SinMoon)
	const off = 5e-6 // the tables' Moon against the exact one
	return least > 0 && (least > turn*turn/8+off || math.Abs(a.SinMoon-b.SinMoon) > turn*turn)
}

// NodeQuality returns, for the field's direction at frame k, its quality there
// and a node value: the quality at any instant between frames k and k+1 is at
// most the line between their node values, which may be a little above 1. Each
// node is bounded with the light floors of both its cells.
func (s *Sky) NodeQuality(g *FrameGrid, k, filter int, c ephemeris.Vec) (q, upper float64) {
	fr := &g.Frames[k]
	sin := fr.SinAltitude(c)
	ft := &s.filters[filter]
	below := sin <= 0
	if below {
		sin = 0 // the line must pass above what quality is just over the horizon
	}
	fl := &g.nodes[k*g.filters+filter]
	row := ft.row(sin)
	light := g.Light(k, filter)
	plain, floor := row.dark+light.twilight, row.dark+fl.twilight
	slack := ft.curve.dark[min(int(sin*curveBins), curveBins-1)]
	if light.moon > 0 {
		cos := fr.Moon.Dot(c)
		f := scattering(cos)
		plain += light.moon * f * row.loss
		if fl.moon > 0 {
			if cos > cosNearBound {
				f = scatterFar
			}
			floor += fl.moon * f * row.loss
		}
	}
	if !below {
		q = math.Min(1, row.clear/plain)
	}
	upper = row.clear / floor
	if fl.moon > 0 {
		slack += fl.l1*ft.curve.cross[min(int(sin*curveBins), curveBins-1)] + upper*(fl.l2+2*fl.l1*fl.l1)
	}
	// The direction moves by under 1" a cell; 4e-6 covers that and the tables.
	return q, upper + slack*g.Step*g.Step/8 + 4e-6
}

var cosNearBound = math.Cos(13 * math.Pi / 180)

// scatterFar is f(rho) at 16 deg, below f anywhere within 13 deg and smooth.
var scatterFar = scatterFunction(16 * math.Pi / 180)
