package constraints

import (
	"context"
	"math"
	"math/bits"

	"nightwright/constraints/survey"
	"nightwright/visibility"
)

// Account says where the hours of one field's demand go, over the period and
// summed over the sites that have a telescope for it. It is sampled.
type Account struct {
	// Before is the time before any other rule: a site's Sun below the demand's
	// limit and the field above the level horizon there, h.
	Before float64
	// Alone is the part of Before in which the rule is broken, whatever else is.
	Alone [ReasonCount]float64
	// Only is the part of Before in which the rule is broken and no other: what
	// would open without it.
	Only [ReasonCount]float64
	// InOrder is the part of Before that falls to the rule when the rules are
	// gone through in the order of Reasons: with Usable they add up to Before.
	InOrder [ReasonCount]float64
	// Usable is what no rule takes away on the telescope that loses least.
	Usable float64
}

// Greatest returns the rule that takes most of the time in order, and false
// when none takes any.
func (a *Account) Greatest() (Reasons, bool) {
	best := -1
	for i, h := range a.InOrder {
		if h > 0 && (best < 0 || h > a.InOrder[best]) {
			best = i
		}
	}
	if best < 0 {
		return 0, false
	}
	return Reason(best), true
}

// Accounts holds the accounts of all demands of the fields asked for.
type Accounts struct {
	first []int32 // by field
	rows  []Account
}

// Of returns the account of a field's demand; the field must be one of those
// asked for.
func (a *Accounts) Of(field, demand int) *Account { return &a.rows[int(a.first[field])+demand] }

// tally counts samples, so that sums don't depend on their order.
type tally struct {
	before, usable int32
	alone, inOrder [ReasonCount]int32
	only           [ReasonCount]int32
}

// NewAccounts samples some fields (by id; nil: all of them) every step seconds
// of the whole period, at multiples of step since 00:00Z; a multiple of the
// slot puts the samples at slot starts.
// min_quality is judged at the sample as if an exposure's middle were there,
// in the filter of each exposure of the demand. It errs only when ctx ends.
func NewAccounts(ctx context.Context, sv *survey.Survey, sky *visibility.Sky, cal *Calendar, fields []int, step float64, workers int) (*Accounts, error) {
	a := &Accounts{first: make([]int32, len(sv.Fields))}
	if fields == nil {
		for i := range sv.Fields {
			fields = append(fields, i)
		}
	}
	n := 0
	for _, i := range fields {
		a.first[i] = int32(n)
		n += len(sv.Fields[i].Rules)
	}
	const chunks = 8
	counts := make([][]tally, chunks)
	parallel(workers, chunks, func(k int) {
		counts[k] = make([]tally, n)
		s := sampler{sv: sv, sky: sky, cal: cal, fields: fields, first: a.first, rows: counts[k], step: step}
		for night := k; night < cal.Nights(); night += chunks {
			for site := range sv.Sites {
				if ctx.Err() == nil {
					s.night(site, night)
				}
			}
		}
	})
	if err := ctx.Err(); err != nil {
		return nil, err
	}
	a.rows = make([]Account, n)
	h := step / 3600
	for _, c := range counts {
		for i := range c {
			r := &a.rows[i]
			r.Before += float64(c[i].before) * h
			r.Usable += float64(c[i].usable) * h
			for k := range ReasonCount {
				r.Alone[k] += float64(c[i].alone[k]) * h
				r.InOrder[k] += float64(c[i].inOrder[k]) * h
				r.Only[k] += float64(c[i].only[k]) * h
			}
		}
	}
	return a, nil
}

// sampler goes through nights with one set of counts.
type sampler struct {
	sv      *survey.Survey
	sky     *visibility.Sky
	cal     *Calendar
	fields  []int
	first   []int32
	rows    []tally
	step    float64
	scopes  []Reasons // of the site's telescopes at this instant
	quality []float64 // by filter, of this field; negative: not worked out
}

func (s *sampler) night(site, night int) {
	iv := s.cal.Night(site, night)
	loosest := math.Inf(-1)
	for _, t := range s.sv.Sites[site].Telescopes {
		if x, ok := s.cal.loosest(t); ok {
			loosest = max(loosest, x)
		}
	}
	for k := math.Ceil(iv.From / s.step); k*s.step < iv.To; k++ {
		fr := s.sky.Frame(site, k*s.step)
		if asin(fr.SinSun) > loosest {
			continue
		}
		s.scopes = s.scopes[:0]
		for _, t := range s.sv.Sites[site].Telescopes {
			s.scopes = append(s.scopes, s.cal.Reasons(t, fr.T))
		}
		b := skyBodies(&fr)
		for _, f := range s.fields {
			s.field(site, f, &fr, b)
		}
	}
}

func (s *sampler) field(site, f int, fr *visibility.Frame, b bodies) {
	c := s.sky.Direction(f, fr.T)
	if fr.SinAltitude(c) <= 0 {
		return
	}
	fd := &s.sv.Fields[f]
	sight := b.sight(fr, c)
	s.quality = s.quality[:0]
	for range s.sv.Filters {
		s.quality = append(s.quality, -1)
	}
	demands := s.sv.Programs[fd.Program].Demands
	for d := range demands {
		if sight.SunAltitude > fd.Rules[d].SunAltitudeMax {
			continue
		}
		sight.Quality = math.Inf(1)
		for _, x := range demands[d].Exposures {
			if s.quality[x.Filter] < 0 {
				s.quality[x.Filter] = s.sky.Quality(fr, x.Filter, c)
			}
			sight.Quality = min(sight.Quality, s.quality[x.Filter])
		}
		best, served := ^Reasons(0), false
		for i, t := range s.sv.Sites[site].Telescopes {
			if !s.sv.Qualifies(fd, &demands[d], t) {
				continue
			}
			served = true
			why := s.scopes[i] | Evaluate(s.sv, f, d, t, &sight)
			if bits.OnesCount16(uint16(why)) < bits.OnesCount16(uint16(best)) {
				best = why
			}
		}
		if served {
			s.rows[int(s.first[f])+d].add(best)
		}
	}
}

func (t *tally) add(why Reasons) {
	t.before++
	if why == 0 {
		t.usable++
		return
	}
	t.inOrder[bits.TrailingZeros16(uint16(why))]++
	if why&(why-1) == 0 {
		t.only[bits.TrailingZeros16(uint16(why))]++
	}
	for w := why; w != 0; w &= w - 1 {
		t.alone[bits.TrailingZeros16(uint16(w))]++
	}
}
