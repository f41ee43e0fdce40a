package seasons

import (
	"nightwright/scheduler/model"
)

// underCloud returns the instant at which the sky closes within [from, to),
// and to when it stays open.
func (pl *Player) underCloud(s *scope, from, to int64) int64 {
	for h := hourOf(from); h <= hourOf(to-1); h++ {
		if !pl.sky.Open(int(s.site), h) {
			return max(from, h*blockTime*model.Micro)
		}
	}
	return to
}

// claim notes that a visit of a want starts; listed ones stand in the plan's
// list, others of a planned season make up for a lost one.
func (pl *Player) claim(s *scope, want int32, start int64, listed bool) {
	pl.f.left[want]--
	pl.last[want] = start
	if pl.nightOf[want] != s.night {
		pl.nightOf[want], pl.tonight[want] = s.night, 0
	}
	pl.tonight[want]++
	if pl.policy == AsPlanned && !listed {
		pl.lost[want]--
	}
}

func (pl *Player) claimSet(s *scope, b *begun, start int64) {
	b.before, b.claimed = pl.last[b.want], true
	pl.claim(s, b.want, start, b.planned)
}

// release takes a claim back.
func (pl *Player) release(want int32, before int64) {
	pl.f.left[want]++
	pl.last[want] = before
	pl.tonight[want]--
	if pl.policy == AsPlanned {
		pl.lost[want]++
	}
}

// single takes a visit of one exposure.
func (pl *Player) single(s *scope, want int32, start int64, listed bool) {
	w := &pl.st.p.Wants[want]
	end := start + pl.st.p.Length(&w.Steps[0], s.id)
	before := pl.last[want]
	pl.claim(s, want, start, listed)
	q, ok := pl.shoot(s, want, 0, start)
	if !ok {
		pl.release(want, before)
		return
	}
	pl.credit(s, want, q, end-start)
	if pl.record {
		pl.out.Taken = append(pl.out.Taken, pl.exposure(s, want, 0, start, end))
	}
}

// shoot takes one exposure: the telescope is busy until its end, or until
// clouds come. It returns the quality, and whether the exposure is whole.
func (pl *Player) shoot(s *scope, want, step int32, start int64) (float64, bool) {
	p := pl.st.p
	w := &p.Wants[want]
	length := p.Length(&w.Steps[step], s.id)
	end := start + length
	gap := int64(0)
	if s.has {
		// Waiting is no part of the gap; what is needed is at most what passed.
		c := p.Direction(w, start)
		to, fr := pl.sight(s, start, c)
		gap = min(start-s.ready, pl.gapTo(s, to, int(w.Steps[step].Filter), fr.HourAngle(c) < 0))
	}
	stop := pl.underCloud(s, start, end)
	if stop < end {
		pl.out.Wasted += model.Sec(stop-start+gap) / 3600
		s.ready = max(stop, s.at+1)
		return 0, false
	}
	mid := start + length/2
	q := p.Quality(w, int(step), s.id, mid)
	first := p.Sky.Direction(int(w.Field), model.Sec(mid))
	_, fr := pl.sight(s, start, first)
	s.to, _ = pl.sight(s, end, first)
	s.east, s.filter, s.has = fr.HourAngle(first) < 0, int(w.Steps[step].Filter), true
	s.ready = end
	s.used += gap + length
	pl.out.Used += model.Sec(gap+length) / 3600
	return q * pl.sky.Factor(int(s.site), hourOf(start)), q >= w.MinQuality
}

// credit counts a visit that was got.
func (pl *Player) credit(s *scope, want int32, quality float64, exposed int64) {
	p := pl.st.p
	w := &p.Wants[want]
	c := w.Value * quality
	pl.out.Visits++
	pl.programs[w.Program] += model.Sec(exposed)
	if pl.bins != nil {
		pl.bins.add(pl.out.Credit, s, w, c)
	}
	if pl.field[w.Field]--; pl.field[w.Field] == 0 {
		c += p.Bonus(int(w.Field))
		pl.finish[w.Field] = s.night
		pl.out.Finished++
	}
	pl.earned[s.night] += c
}

func (pl *Player) exposure(s *scope, want, step int32, start, end int64) model.Exposure {
	w := &pl.st.p.Wants[want]
	return model.Exposure{
		Field: w.Field, Demand: w.Demand, Step: step, Telescope: s.id, Night: s.night,
		State: model.Planned, Start: start, End: end,
	}
}

// expose takes a step of a set and plans the next, or counts the set.
func (pl *Player) expose(s *scope, b *begun, step int32, start int64) {
	p := pl.st.p
	w := &p.Wants[b.want]
	end := start + p.Length(&w.Steps[step], s.id)
	q, ok := pl.shoot(s, b.want, step, start)
	if !ok {
		pl.fail(s, b)
		return
	}
	b.quality += q / float64(len(w.Steps))
	b.time += end - start
	if pl.record {
		b.taken = append(b.taken, pl.exposure(s, b.want, step, start, end))
	}
	if int(step) == len(w.Steps)-1 {
		pl.credit(s, b.want, b.quality, b.time)
		if pl.record {
			for i := range b.taken {
				b.taken[i].Set = int64(pl.out.Visits)
			}
			pl.out.Taken = append(pl.out.Taken, b.taken...)
		}
		return
	}
	next := &w.Steps[step+1]
	pl.due(s, commit{want: b.want, step: step + 1, earliest: start + next.After - next.Tolerance, latest: start + next.After + next.Tolerance, set: b})
}

// due puts an exposure among those that must follow, by their latest start.
func (pl *Player) due(s *scope, c commit) {
	at := len(s.pending)
	for at > 0 && s.pending[at-1].latest > c.latest {
		at--
	}
	s.pending = append(s.pending, commit{})
	copy(s.pending[at+1:], s.pending[at:])
	s.pending[at] = c
}

// follow takes the first of the exposures that are due, at start.
func (pl *Player) follow(s *scope, start int64) {
	p := pl.st.p
	c := s.pending[0]
	s.pending = s.pending[:copy(s.pending, s.pending[1:])]
	w := &p.Wants[c.want]
	length := p.Length(&w.Steps[c.step], s.id)
	if start += pl.overBudget(s, start, length); start > c.latest {
		pl.giveUp(s, c)
		return
	}
	span := length
	if c.set != nil && c.step == 0 {
		span = pl.st.span(w, s.id)
	}
	can := pl.sky.Open(int(s.site), hourOf(start)) && pl.legal(s, w, start, span)
	if c.step == 0 { // of a list: what was made up for may be too near
		can = can && start-pl.last[c.want] >= w.Spacing && pl.f.left[c.want] > 0
	}
	switch {
	case !can:
		pl.giveUp(s, c)
		return
	case c.set == nil:
		pl.single(s, c.want, start, true)
		return
	case !c.set.claimed:
		pl.claimSet(s, c.set, start)
	}
	pl.expose(s, c.set, c.step, start)
}

// abandon gives up an exposure that came too late, and its set.
func (pl *Player) abandon(s *scope) {
	c := s.pending[0]
	s.pending = s.pending[:copy(s.pending, s.pending[1:])]
	pl.giveUp(s, c)
}

// giveUp leaves an exposure that was due, and its set.
func (pl *Player) giveUp(s *scope, c commit) {
	if c.set == nil {
		pl.lost[c.want]++
		return
	}
	pl.fail(s, c.set)
}

// fail gives up a set: what was taken of it counts for nothing.
func (pl *Player) fail(s *scope, b *begun) {
	if b.dead {
		return
	}
	b.dead = true
	kept := s.pending[:0]
	for _, c := range s.pending {
		if c.set != b {
			kept = append(kept, c)
		}
	}
	s.pending = kept
	spent := model.Sec(b.time) / 3600
	pl.out.Used -= spent
	pl.out.Wasted += spent
	if !b.claimed {
		pl.lost[b.want]++ // it never began
		return
	}
	pl.release(b.want, b.before)
}

// drop gives up what is due when a night ends.
func (pl *Player) drop(s *scope) {
	for len(s.pending) > 0 {
		pl.abandon(s)
	}
}
