package dual

import (
	"math"

	"nightwright/scheduler/model"
)

// Shares in the relaxation. For a program p with exposure time T_p of all the
// planned time T, and t_p the longest a visit of it can expose,
//
//	min:  T_p - min T + t_p >= 0      multiplier low[p]  >= 0
//	max:  max T + t_p - T_p >= 0      multiplier high[p] >= 0
//
// hold "to within one visit". Their Lagrangian adds to each second of exposure
// of program q
//
//	sum_p low[p] ([q = p] - min_p) + high[p] (max_p - [q = p])
//
// and the constant sum_p (low[p] + high[p]) t_p. Time that is given counts in T
// too: it adds each program's rate times its given seconds to the constant.
type shareState struct {
	min, max  []float64 // the bounds, of all exposure time
	low, high []float64 // C per second
	longest   []float64 // t_p, s
	given     []float64 // exposure time of what is given, s; nil: none
	stepLow   []float64
	stepHigh  []float64
	oldLow    []float64
	oldHigh   []float64
	any       bool
}

func newShareState(p *model.Problem) *shareState {
	n := len(p.Survey.Programs)
	s := &shareState{
		min: make([]float64, n), max: make([]float64, n), low: make([]float64, n), high: make([]float64, n),
		longest: p.LongestVisits(), given: p.GivenSeconds,
		stepLow: make([]float64, n), stepHigh: make([]float64, n),
		oldLow: make([]float64, n), oldHigh: make([]float64, n),
	}
	for i := range n {
		s.stepLow[i], s.stepHigh[i] = 2, 2
		pr := &p.Survey.Programs[i]
		s.min[i], s.max[i] = pr.ShareMin, pr.ShareMax
		s.any = s.any || pr.ShareMin > 0 || pr.ShareMax < 1
	}
	return s
}

// move changes the multipliers after a step that planned the given exposure
// time by program, s.
func (s *shareState) move(time []float64, size float64) {
	var all float64
	for i := range time {
		if s.given != nil {
			time[i] += s.given[i]
		}
		all += time[i]
	}
	if !s.any || all == 0 {
		return
	}
	for i := range time {
		if s.min[i] > 0 {
			push(&s.low[i], &s.stepLow[i], &s.oldLow[i], s.min[i]-time[i]/all, size)
		}
		if s.max[i] < 1 {
			push(&s.high[i], &s.stepHigh[i], &s.oldHigh[i], time[i]/all-s.max[i], size)
		}
	}
}

// push moves one multiplier by its relative breach, with a step of its own
// that shrinks when the breach changes sign.
func push(m, step, old *float64, breach, size float64) {
	if breach**old < 0 {
		*step *= 0.6
	}
	*old = breach
	*m = math.Max(0, *m+size**step*breach)
}

// rates writes the value a second of exposure has beside its coverage.
func (s *shareState) rates(out []float64) {
	for q := range out {
		out[q] = 0
		for i := range s.low {
			out[q] += s.high[i]*s.max[i] - s.low[i]*s.min[i]
			if i == q {
				out[q] += s.low[i] - s.high[i]
			}
		}
	}
}

// slack is the constant of the Lagrangian.
func (s *shareState) slack(rates []float64) float64 {
	var sum float64
	for i := range s.low {
		sum += (s.low[i] + s.high[i]) * s.longest[i]
		if s.given != nil {
			sum += rates[i] * s.given[i]
		}
	}
	return sum
}

// Relax moves a program's share bounds out as far as a plan's share needs,
// for a ceiling of the plans that keep them so far. The multipliers stay: any
// give a bound, but those sought for a bound out of reach give a poor one; see
// Damp.
func (a *Ascent) Relax(program int, share float64) {
	s := a.shares
	s.min[program], s.max[program] = math.Min(s.min[program], share), math.Max(s.max[program], share)
	s.rates(a.oracle.Share)
}

// Damp takes part of a program's share multipliers away: part 1 leaves them, 0
// drops them.
func (a *Ascent) Damp(program int, part float64) {
	s := a.shares
	s.low[program] *= part
	s.high[program] *= part
	s.rates(a.oracle.Share)
}

// ShareRates returns what a second of exposure of each program is worth beside
// its coverage, C per second.
func (a *Ascent) ShareRates() []float64 { return append([]float64(nil), a.oracle.Share...) }
