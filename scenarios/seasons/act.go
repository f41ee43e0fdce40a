package seasons

import (
	"math"

	"nightwright/constraints/mount"
	"nightwright/constraints/survey"
	"nightwright/scheduler/model"
	"nightwright/visibility"
	"nightwright/visibility/ephemeris"
)

// shortSize is how many candidates of a slot are looked at with their slews.
const shortSize = 24

// lookAhead is how many of the exposures that are due a new visit is held
// against.
const lookAhead = 8

// trust is how much of what a visit would be worth later is believed: later
// hours are shared with others. Measured on the medium family, where 1 gets
// 0.661, 0.95 0.697, 0.9 0.700 and 0.85 0.698.
const trust = 0.9

// slotTime is how long a shortlist holds, us.
const slotTime = model.ShelfStep * model.Micro

// gapGuard is added to every gap, us: the fast sky's directions are good to a
// fraction of an arc second.
const gapGuard = 20_000

// act takes the next step of a telescope: the exposure that is due, or the
// visit that is worth most of its time, or waiting.
func (pl *Player) act(s *scope) {
	if len(s.pending) > 0 {
		c := &s.pending[0]
		if start := pl.soonest(s, c.want, c.step, c.earliest); start > c.latest {
			pl.abandon(s)
			return
		} else if start <= s.at+model.Micro || c.earliest <= s.at+pl.usualGap(s) {
			pl.follow(s, start)
			return
		}
	}
	if pl.fill(s) {
		return
	}
	next := (s.at/slotTime + 1) * slotTime
	if len(s.pending) > 0 {
		c := &s.pending[0]
		if start := pl.soonest(s, c.want, c.step, c.earliest); start <= next {
			pl.follow(s, start)
			return
		}
	}
	s.ready = next
}

// sight turns a direction into what the mount points by, at an instant.
func (pl *Player) sight(s *scope, us int64, c ephemeris.Vec) (mount.Pointing, visibility.Frame) {
	fr := pl.st.p.Sky.Horizon(int(s.site), model.Sec(us))
	if pl.st.p.Scopes[s.id].Mount == survey.Equatorial {
		return mount.Pointing{HourAngle: fr.HourAngle(c), Declination: fr.Declination(c)}, fr
	}
	alt, az := fr.AltAz(c)
	return mount.Pointing{Altitude: alt, Azimuth: az}, fr
}

// gapTo is the gap the telescope needs before an exposure, us.
func (pl *Player) gapTo(s *scope, to mount.Pointing, filter int, east bool) int64 {
	if !s.has {
		return 0
	}
	t := pl.st.p.Scopes[s.id].Telescope
	return model.MicroCeil(mount.Gap(t, s.to, to, s.filter, filter, s.east, east)+steep(t, &s.to, &to)) + gapGuard
}

// steep is how much longer a slew may be found near the zenith, or the pole of
// an equatorial mount, where an axis has far to go for an arc second, s.
func steep(t *survey.Telescope, a, b *mount.Pointing) float64 {
	const edge, more = 80 * math.Pi / 180, 0.5
	if t.Mount == survey.Altazimuth && (a.Altitude > edge || b.Altitude > edge) {
		return more
	}
	if t.Mount == survey.Equatorial && (math.Abs(a.Declination) > edge || math.Abs(b.Declination) > edge) {
		return more
	}
	return 0
}

// soonest returns the first start, not before earliest, that the gap allows.
func (pl *Player) soonest(s *scope, want, step int32, earliest int64) int64 {
	start := max(s.ready, earliest)
	if !s.has {
		return start
	}
	w := &pl.st.p.Wants[want]
	filter := int(w.Steps[step].Filter)
	for range 4 { // the field moves while the telescope slews
		c := pl.st.p.Direction(w, start)
		to, fr := pl.sight(s, start, c)
		need := s.ready + pl.gapTo(s, to, filter, fr.HourAngle(c) < 0)
		if need <= start {
			return start
		}
		start = need
	}
	return start + 50_000
}

// usualGap is a gap that is rarely exceeded, us.
func (pl *Player) usualGap(s *scope) int64 {
	t := &pl.st.p.Scopes[s.id]
	g := t.TypicalGap + t.TypicalGap/2
	if !t.DuringSlew && len(t.Filters) > 1 {
		g += model.MicroOf(t.FilterChange)
	}
	return g
}

// fill takes the best visit there is, if any.
func (pl *Player) fill(s *scope) bool {
	if slot := s.at / slotTime; slot != s.slot {
		pl.shortlist(s, slot)
	}
	t := pl.st.p.Scopes[s.id].Telescope
	for len(s.short) > 0 {
		best, top := -1, 0.0
		for i := range s.short {
			c := &s.short[i]
			if !pl.wants(s, c.want, s.at) {
				continue
			}
			gap := 0.0
			if s.has {
				gap = mount.Gap(t, s.to, c.to, s.filter, int(pl.st.p.Wants[c.want].Steps[0].Filter), s.east, c.to.HourAngle < 0)
			}
			if x := (c.value*c.quality - c.reserve) / (c.busy + gap); x > top {
				best, top = i, x
			}
		}
		if best < 0 {
			return false
		}
		if pl.begin(s, s.short[best].want) {
			return true
		}
		s.short[best] = s.short[len(s.short)-1]
		s.short = s.short[:len(s.short)-1]
	}
	return false
}

// wants reports whether a want may have a visit that starts now.
func (pl *Player) wants(s *scope, want int32, at int64) bool {
	w := &pl.st.p.Wants[want]
	if pl.f.left[want] <= 0 || at-pl.last[want] < w.Spacing {
		return false
	}
	if w.PerNight > 0 && pl.nightOf[want] == s.night && pl.tonight[want] >= w.PerNight {
		return false
	}
	if pl.policy != AsPlanned {
		return true
	}
	return pl.lost[want] > 0 && pl.clearOfList(s, want, at)
}

// begin starts a visit of a want as soon as the gap allows; false when it
// doesn't fit.
func (pl *Player) begin(s *scope, want int32) bool {
	p := pl.st.p
	w := &p.Wants[want]
	start := pl.soonest(s, want, 0, s.at)
	length := p.Length(&w.Steps[0], s.id)
	if !pl.wants(s, want, start) || !pl.legal(s, w, start, pl.st.span(w, s.id)) {
		return false
	}
	if late := pl.overBudget(s, start, length); late > 0 {
		if start += late; !pl.legal(s, w, start, pl.st.span(w, s.id)) {
			return false
		}
	}
	if !pl.sky.Open(int(s.site), hourOf(start)) || !pl.fits(s, w, start) {
		return false
	}
	if p.Quality(w, 0, s.id, start+length/2) < w.MinQuality {
		return false
	}
	if len(w.Steps) == 1 {
		pl.single(s, want, start, false)
		return true
	}
	b := &begun{want: want}
	pl.claimSet(s, b, start)
	pl.expose(s, b, 0, start)
	return true
}

// legal reports whether [start, start+span) lies in one window and in the
// present open interval.
func (pl *Player) legal(s *scope, w *model.Want, start, span int64) bool {
	p := pl.st.p
	open := p.Open(int(s.id), int(s.night))[s.span]
	if start < open.From || start+span > open.To {
		return false
	}
	for _, win := range p.Windows.Of(int(w.Unit), int(p.Scopes[s.id].Class), int(s.night)) {
		if from, to := p.Inward(win); start >= from && start+span <= to {
			return true
		}
	}
	return false
}

// fits reports whether what is due can still be done after a visit.
func (pl *Player) fits(s *scope, w *model.Want, start int64) bool {
	p := pl.st.p
	usual := pl.usualGap(s)
	now := start + p.Length(&w.Steps[0], s.id)
	var own *commit
	if len(w.Steps) > 1 {
		own = &commit{earliest: start + w.Steps[1].After - w.Steps[1].Tolerance, latest: start + w.Steps[1].After + w.Steps[1].Tolerance}
		own.want, own.step = -1, 1
	}
	then := func(c *commit, length int64) bool {
		at := max(now+usual, c.earliest)
		now = at + length
		return at <= c.latest
	}
	for i := range min(len(s.pending), lookAhead) {
		c := &s.pending[i]
		if own != nil && own.latest < c.latest {
			if !then(own, p.Length(&w.Steps[1], s.id)) {
				return false
			}
			own = nil
		}
		if !then(c, p.Length(&p.Wants[c.want].Steps[c.step], s.id)) {
			return false
		}
	}
	return own == nil || then(own, p.Length(&w.Steps[1], s.id))
}

// overBudget returns by how much an exposure must be put off so that
// exposures and gaps take no more than keep_free leaves of the open sky so
// far, us; 0 when it need not be.
func (pl *Player) overBudget(s *scope, start, length int64) int64 {
	p := pl.st.p
	keep := p.Scopes[s.id].KeepFree
	if keep == 0 {
		return 0
	}
	var elapsed int64
	end := start + length
	for _, o := range p.Open(int(s.id), int(s.night)) {
		for at := o.From; at < min(o.To, end); {
			stop := min(o.To, end, (hourOf(at)+1)*blockTime*model.Micro)
			if pl.sky.Open(int(s.site), hourOf(at)) {
				elapsed += stop - at
			}
			at = stop
		}
	}
	used := s.used + length
	if s.has {
		used += start - s.ready
	}
	over := float64(used) - (1-keep)*float64(elapsed)
	if over <= 0 {
		return 0
	}
	// The wait itself is no gap that is needed.
	return int64(over/(1-keep)) + model.Micro
}
