package audit

import (
	"cmp"
	"math"
	"slices"

	"nightwright/constraints/survey"
)

// visit is one visit: an exposure, or the exposures of one set.
type visit struct {
	shots   []*shot // by start
	broken  bool    // a set that isn't whole, or of mixed parts
	quality float64 // mean over the exposures
	sound   bool    // whole, and no exposure under min_quality
	done    bool
}

func (v *visit) first() *shot { return v.shots[0] }

// group puts the exposures of sets together and tells which step of its demand
// each is. It runs before the sky is asked.
func (c *trial) group() {
	sets := map[int64]int{}
	for i := range c.shots {
		s := &c.shots[i]
		if !s.known {
			continue
		}
		if s.Set == 0 {
			c.visits = append(c.visits, visit{shots: []*shot{s}})
			continue
		}
		k, ok := sets[s.Set]
		if !ok {
			k = len(c.visits)
			sets[s.Set] = k
			c.visits = append(c.visits, visit{})
		}
		c.visits[k].shots = append(c.visits[k].shots, s)
	}
	for k := range c.visits {
		c.visits[k].done = true
		for _, s := range c.visits[k].shots {
			c.visits[k].done = c.visits[k].done && s.done
		}
		c.steps(&c.visits[k])
	}
}

// steps judges the make-up of a visit.
func (c *trial) steps(v *visit) {
	s := v.first()
	d := c.demand(s)
	want, got := len(d.Exposures), len(v.shots)
	fail := func(format string, args ...any) {
		v.broken = true
		if !v.done {
			s.breach(RuleSet, float64(got), float64(want), "", format, args...)
		}
	}
	for _, x := range v.shots[1:] {
		if x.field != s.field || x.demand != s.demand {
			fail("set %d is of more than one field or demand", s.Set)
			return
		}
	}
	switch {
	case want == 1 && s.Set != 0:
		fail("its demand has no sets; set must be empty")
		return
	case want > 1 && s.Set == 0:
		fail("its demand has sets of %d exposures; it belongs to none", want)
		return
	case want != got:
		fail("set %d has %d exposures; want %d", s.Set, got, want)
		return
	}
	for k, x := range v.shots {
		x.step = k
	}
}

// cadence judges sets, gaps between visits, counts per night and in all.
func (c *trial) cadence() {
	for k := range c.visits {
		c.weigh(&c.visits[k])
	}
	order := make([]*visit, 0, len(c.visits))
	for k := range c.visits {
		order = append(order, &c.visits[k])
	}
	slices.SortStableFunc(order, func(a, b *visit) int {
		x, y := a.first(), b.first()
		return cmp.Or(cmp.Compare(x.field, y.field), cmp.Compare(x.demand, y.demand), cmp.Compare(x.Start, y.Start))
	})
	for from := 0; from < len(order); {
		to := from + 1
		for to < len(order) && order[to].first().field == order[from].first().field && order[to].first().demand == order[from].first().demand {
			to++
		}
		c.row(order[from:to])
		from = to
	}
}

// weigh works out a visit's quality, and tests a set's times.
func (c *trial) weigh(v *visit) {
	s := v.first()
	least := c.j.sv.Fields[s.field].Rules[s.demand].MinQuality
	v.sound = !v.broken
	for _, x := range v.shots {
		q := x.quality
		if x.done {
			q = c.doneQuality(x)
			x.quality = q
		}
		v.quality += q / float64(len(v.shots))
		v.sound = v.sound && q >= least*(1-ratioSlack)
	}
	if v.broken || v.done {
		return
	}
	d := c.demand(s)
	for k := 1; k < len(v.shots); k++ {
		a, b := v.shots[k-1], v.shots[k]
		if b.scope != s.scope || b.day != s.day {
			b.breach(RuleSet, 0, 0, "", "set %d is not of one telescope and night", s.Set)
			return
		}
		is, want := float64(b.Start-a.Start)/1e6, d.Exposures[k].After
		if off := math.Abs(is - want); off > d.Exposures[k].Tolerance+timeSlack*1e-6 {
			b.breach(RuleAfter, is, want, "s", "it starts %.6f s after the exposure before; want %.6f within %.6f s", is, want, d.Exposures[k].Tolerance)
		}
	}
}

// row judges the visits of one demand of one field, by start.
func (c *trial) row(list []*visit) {
	d := c.demand(list[0].first())
	perNight := map[survey.Day]int{}
	var before *visit // the last one that binds
	until := int64(math.MinInt64)
	kept, counted := 0, 0
	for _, v := range list {
		s := v.first()
		if v.done && !v.sound {
			continue // it earns nothing and doesn't bind
		}
		if before != nil && !(v.done && before.done) {
			if is := s.Start - before.first().Start; float64(is) < d.GapMin*1e6-timeSlack {
				s.breach(RuleGapMin, float64(is)/1e6, d.GapMin, "s", "it starts %.6f s after visit %d of the same demand; gap.min is %.6f s", float64(is)/1e6, before.first().Visit.Visit, d.GapMin)
			}
		}
		if len(d.Exposures) > 1 && before != nil && !v.done && !v.broken && s.Start < until {
			s.breach(RuleOverlap, float64(until-s.Start)/1e6, 0, "s", "its set starts before the set before it of the same demand has ended")
		}
		before = v
		for _, x := range v.shots {
			until = max(until, x.End)
		}
		if perNight[s.day]++; d.PerNight > 0 && perNight[s.day] > d.PerNight && !v.done {
			s.breach(RulePerNight, float64(perNight[s.day]), float64(d.PerNight), "", "%d visits have the label %v; per_night is %d", perNight[s.day], s.day, d.PerNight)
		}
		if kept++; kept > d.Visits && !v.done {
			s.breach(RuleCount, float64(kept), float64(d.Visits), "", "it is visit %d of its demand, which wants %d", kept, d.Visits)
		}
		if v.sound && counted < d.Visits {
			counted++
			unit := c.j.unit(s.field) / float64(len(v.shots))
			for _, x := range v.shots {
				x.counts, x.unit = true, unit
			}
		}
	}
}

// unit is what quality 1 of one visit of a field adds to C.
func (j *Judge) unit(field int) float64 {
	if j.total <= 0 {
		return 0
	}
	return j.weight(field) / (float64(j.wanted(field)) * (1 + j.sv.FinishBonus) * j.total)
}

// doneQuality is what the ledger says of an exposure that was done; where it
// says nothing (NaN), the quality of the exact sky times the part of the wanted
// time that the exposure had.
func (c *trial) doneQuality(s *shot) float64 {
	q, ok := c.done[doneKey{s.Telescope, s.Start}]
	if !math.IsNaN(q) || !ok {
		return math.Max(0, math.Min(1, q))
	}
	d := c.demand(s)
	step := s.step
	if step < 0 { // of a broken set: the first exposure in its filter
		step = slices.IndexFunc(d.Exposures, func(x survey.Exposure) bool { return x.Filter == s.filter })
	}
	if step < 0 {
		return 0
	}
	want := d.Exposures[step].Duration * c.j.sv.Telescopes[s.scope].ExposureScale
	if had := s.to - s.from; had < want-rootSlack {
		return s.quality * had / want
	}
	return s.quality
}
