package visibility

import (
	"math"
	"slices"

	"nightwright/visibility/ephemeris"
)

// BoundGrid cuts one site's night into cells for proven bounds on quality:
// every step seconds, where the Moon rises or sets (a cell of a few seconds
// about it, in which the Moon counts as down), and each minute in twilight.
type BoundGrid struct {
	Frames []Frame // cell k lies between Frames[k] and Frames[k+1]
	cells  []cellFloor
	sky    *Sky
}

// cellFloor bounds a cell's light from below, for one filter.
type cellFloor struct {
	left, right float64 // Light.moon at its ends; 0 when the Moon is not up all through
	twilight    float64 // least of the cell
	l1, l2      float64 // bounds on M'/M (1/s) and M''/M (1/s^2)
}

const (
	riseGuard    = 2.0  // s about a moonrise: the fast path's time of it is good to 0.2 s
	twilightStep = 60.0 // s
)

// BoundGrid builds the cells that cover [from, to].
func (s *Sky) BoundGrid(site int, from, to, step float64) *BoundGrid {
	g := &BoundGrid{sky: s}
	for _, t := range s.cuts(site, from, to, step) {
		g.Frames = append(g.Frames, s.Frame(site, t))
	}
	n := len(s.filters)
	g.cells = make([]cellFloor, (len(g.Frames)-1)*n)
	for k := range len(g.Frames) - 1 {
		a, b := &g.Frames[k], &g.Frames[k+1]
		for f := range n {
			la, lb := s.Light(a, f), s.Light(b, f)
			c := &g.cells[k*n+f]
			if !culminates(a, b) {
				c.twilight = math.Min(la.twilight, lb.twilight)
			}
			if staysUp(a, b) && b.T-a.T > 2*riseGuard {
				c.left, c.right = la.moon, lb.moon
				m := s.filters[f].curve.moon[min(int(math.Min(a.SinMoon, b.SinMoon)*moonBins), moonBins-1)]
				c.l1, c.l2 = m[0], m[1]
			}
		}
	}
	return g
}

// cuts lists the cell edges, ascending.
func (s *Sky) cuts(site int, from, to, step float64) []float64 {
	var out []float64
	for k := math.Floor(from / step); ; k++ {
		t := k * step
		out = append(out, t)
		if t >= to {
			break
		}
	}
	end := len(out)
	for i := 1; i < end; i++ {
		a, b := s.Frame(site, out[i-1]), s.Frame(site, out[i])
		if (a.SinMoon > 0) != (b.SinMoon > 0) {
			t := s.moonCrossing(site, &a, &b)
			out = append(out, t-riseGuard/2, t+riseGuard/2)
		}
		if a.SinSun > sinTwilightEnd || b.SinSun > sinTwilightEnd {
			for t := a.T + twilightStep; t < b.T-1; t += twilightStep {
				out = append(out, t)
			}
		}
	}
	slices.Sort(out)
	return slices.Compact(out)
}

// moonCrossing finds when the Moon rises or sets between two frames, to 0.1 s.
func (s *Sky) moonCrossing(site int, a, b *Frame) float64 {
	lo, hi := a.T, b.T
	for hi-lo > 0.1 {
		mid := (lo + hi) / 2
		m := s.Frame(site, mid)
		if (m.SinMoon > 0) == (a.SinMoon > 0) {
			lo = mid
		} else {
			hi = mid
		}
	}
	return (lo + hi) / 2
}

// MoonEdge is a moonrise or moonset: a jump of the sky's brightness.
type MoonEdge struct {
	T    float64 // UTC, Unix s
	Rise bool
}

// Dark returns an instant just on the moonless side of the edge.
func (e MoonEdge) Dark() float64 {
	if e.Rise {
		return e.T - riseGuard
	}
	return e.T + riseGuard
}

// MoonEdges lists the moonrises and moonsets of a grid's night, ascending.
func (s *Sky) MoonEdges(site int, g *FrameGrid) []MoonEdge {
	var out []MoonEdge
	for i := range g.Cells() {
		a, b := &g.Frames[i], &g.Frames[i+1]
		if (a.SinMoon > 0) != (b.SinMoon > 0) {
			out = append(out, MoonEdge{s.moonCrossing(site, a, b), b.SinMoon > 0})
		}
	}
	return out
}

// Cell returns the index of the cell that holds an instant, within the grid.
func (g *BoundGrid) Cell(unix float64) int {
	lo, hi := 0, len(g.Frames)-1
	for hi-lo > 1 {
		m := (lo + hi) / 2
		if g.Frames[m].T <= unix {
			lo = m
		} else {
			hi = m
		}
	}
	return lo
}

// Bound returns, for the field's direction in cell k, values at its ends such
// that the quality at any instant of the cell is at most the line between
// them. They may be a little above 1: a line between ends held down to 1
// would cut off what the slack is for. See the head of upper.go.
func (g *BoundGrid) Bound(k, filter int, c ephemeris.Vec) (left, right float64) {
	ft := &g.sky.filters[filter]
	fl := &g.cells[k*len(g.sky.filters)+filter]
	a, b := &g.Frames[k], &g.Frames[k+1]
	sa, sb := a.SinAltitude(c), b.SinAltitude(c)
	left = ft.above(sa, fl.left, fl.twilight, a, c)
	right = ft.above(sb, fl.right, fl.twilight, b, c)
	bin := min(max(int(math.Max(sa, sb)*curveBins), 0), curveBins-1)
	curve := ft.curve.dark[bin]
	if fl.left > 0 {
		curve += fl.l1*ft.curve.cross[bin] + math.Max(left, right)*(fl.l2+2*fl.l1*fl.l1)
	}
	h := b.T - a.T
	// The direction moves by under 1" a cell; 4e-6 covers that and the tables.
	slack := curve*h*h/8 + 4e-6
	return left + slack, right + slack
}

// above evaluates R of upper.go with the cell's light floors, below the
// horizon as on it.
func (ft *filterSky) above(sin, moon, twilight float64, fr *Frame, c ephemeris.Vec) float64 {
	// Below the horizon the quality is 0, but the line must pass above what it
	// is just over it.
	row := ft.row(math.Max(0, sin))
	sky := row.dark + twilight
	if moon > 0 {
		cos := fr.Moon.Dot(c)
		f := scatterFar
		if cos <= cosNearBound {
			f = scattering(cos)
		}
		sky += moon * f * row.loss
	}
	return row.clear / sky
}
