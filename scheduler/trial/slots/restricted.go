package slots

import (
	"math"

	"nightwright/constraints"
	"nightwright/constraints/mount"
	"nightwright/scheduler/model"
	"nightwright/visibility"
)

// skyline gives qualities on the exact path, one instant worked out once.
type skyline struct {
	p     *model.Problem
	exact *visibility.Exact
	known map[spot]lit
}

type spot struct {
	field, filter, site int32
	at                  int64
}

// lit is a quality, and whether the Moon is up.
type lit struct {
	q  float64
	up bool
}

// at gives the quality of an exposure of a field whose middle is at an
// instant, and whether the Moon is up then.
func (s *skyline) at(field, filter, site int32, at int64) (float64, bool) {
	key := spot{field, filter, site, at}
	if l, ok := s.known[key]; ok {
		return l.q, l.up
	}
	sv := s.p.Survey
	f := &sv.Fields[field]
	place := constraints.Place(&sv.Sites[site])
	now := s.exact.At(model.Sec(at))
	star := now.Star(place, visibility.Position{RA: f.RA, Dec: f.Dec, PMRA: f.PMRA, PMDec: f.PMDec})
	sun, moon := now.Sun(place), now.Moon(place)
	q := visibility.Quality(sv.Filters[filter], visibility.Geometry{
		SinAltitude: math.Sin(star.Altitude), SunAltitude: sun.Altitude, MoonAltitude: moon.Altitude,
		MoonSeparation: visibility.Separation(star, moon.Horizontal), MoonPhaseAngle: moon.PhaseAngle,
	})
	s.known[key] = lit{q, moon.Altitude > 0}
	return q, moon.Altitude > 0
}

// LongestGap is the longest there can be between two exposures of a
// telescope, us: a full turn of an axis, a filter change and a flip.
func LongestGap(p *model.Problem, scope int) int64 {
	t := p.Scopes[scope].Telescope
	s := math.Max(t.Readout, t.Slew.Settle+mount.AxisTime(2*math.Pi, t.Slew.Rate, t.Slew.Acceleration)) + t.FilterChange
	if t.Flip != nil {
		s += t.Flip.Time
	}
	return model.MicroCeil(s)
}

// choice is where one step of a want may begin, with its quality.
type choice struct {
	at int64
	q  float64
}

// Restricted builds the programme whose every solution is a legal plan. grid
// is the step of the starts, s.
func Restricted(p *model.Problem, exact *visibility.Exact, grid float64, shares []Share) *Program {
	a := &ask{p: p, grid: model.MicroOf(grid), shares: shares, out: &Program{}}
	sky := &skyline{p, exact, map[spot]lit{}}
	for wi := range p.Wants {
		w := &p.Wants[wi]
		for _, t := range w.Scopes {
			gap := LongestGap(p, int(t))
			for n := range p.Nights {
				steps := make([][]choice, len(w.Steps))
				for k := range steps {
					steps[k] = a.onGrid(sky, w, k, t, n)
				}
				a.join(wi, t, n, gap, steps, nil, 0)
			}
		}
	}
	a.finish()
	return a.out
}

// onGrid lists the grid's instants at which a step may begin in a plan.
func (a *ask) onGrid(sky *skyline, w *model.Want, step int, t int32, n int) []choice {
	p := a.p
	length := p.Length(&w.Steps[step], t)
	var out []choice
	for _, win := range p.Windows.Of(int(w.Unit), int(p.Scopes[t].Class), n) {
		wf, wt := p.Inward(win)
		for _, o := range p.Open(int(t), n) {
			lo, hi := max(wf, o.From), min(wt, o.To)-length
			for at := (lo + a.grid - 1) / a.grid * a.grid; at <= hi; at += a.grid {
				q, _ := sky.at(w.Field, w.Steps[step].Filter, p.Scopes[t].Site, at+length/2)
				if q >= w.MinQuality+1e-9 {
					out = append(out, choice{at, q})
				}
			}
		}
	}
	return out
}

// join makes columns of all ways to follow the steps of a want, each within
// its tolerance after the one before and clear of it.
func (a *ask) join(wi int, t int32, n int, gap int64, steps [][]choice, starts []int64, sum float64) {
	w := &a.p.Wants[wi]
	k := len(starts)
	if k == len(steps) {
		a.column(wi, t, n, gap, starts, sum/float64(k))
		return
	}
	for _, c := range steps[k] {
		if k > 0 {
			d := c.at - starts[k-1]
			st := &w.Steps[k]
			busy := (a.p.Length(&w.Steps[k-1], t) + gap)
			lo, hi := st.After-st.Tolerance, st.After+st.Tolerance
			if a.spread > 0 {
				busy = busy / a.grid * a.grid
				lo, hi = lo/a.grid*a.grid, (hi/a.grid+1)*a.grid
			}
			if d < busy || d < lo || d > hi {
				continue
			}
		}
		a.join(wi, t, n, gap, steps, append(starts[:k:k], c.at), sum+c.q)
	}
}

// column adds one way to make a visit.
func (a *ask) column(wi int, t int32, n int, gap int64, starts []int64, quality float64) {
	w := &a.p.Wants[wi]
	c := Column{Want: int32(wi), Scope: t, Night: int32(n), Starts: starts, Value: w.Value * quality}
	for k, at := range starts {
		length := a.p.Length(&w.Steps[k], t)
		c.Exposure += model.Sec(length)
		c.use += model.Sec(length + gap)
		busy := length + gap
		if a.spread > 0 {
			busy = busy / a.grid * a.grid
		}
		c.busy = append(c.busy, model.Span{From: at, To: at + busy})
	}
	a.out.Columns = append(a.out.Columns, c)
}

// Exposures turns a solution's columns into the exposures of a plan; taken is
// by column.
func (pr *Program) Exposures(p *model.Problem, taken []float64) []model.Exposure {
	var out []model.Exposure
	set := int64(0)
	for i := range pr.Columns {
		if taken[i] < 0.5 {
			continue
		}
		c := &pr.Columns[i]
		w := &p.Wants[c.Want]
		if len(c.Starts) > 1 {
			set++
		}
		for k, at := range c.Starts {
			e := model.Exposure{
				Visit: int64(len(out) + 1), Field: w.Field, Demand: w.Demand, Step: int32(k), Telescope: c.Scope, Night: c.Night,
				State: model.Planned, Start: at, End: at + p.Length(&w.Steps[k], c.Scope),
			}
			if len(c.Starts) > 1 {
				e.Set = set
			}
			out = append(out, e)
		}
	}
	return out
}
