package seasons

import (
	"nightwright/constraints/survey"
	"nightwright/scheduler/model"
	"nightwright/visibility"
)

// shortlist picks the candidates of a slot that are worth most of their time.
func (pl *Player) shortlist(s *scope, slot int64) {
	p := pl.st.p
	if block := int32(hourOf(s.at) - pl.night(s).hour); block != s.block {
		pl.candidates(s, block)
	}
	s.slot, s.short = slot, s.short[:0]
	scope := &p.Scopes[s.id]
	factor := pl.sky.Factor(int(s.site), hourOf(s.at))
	for i := range s.cands {
		c := &s.cands[i]
		w := &p.Wants[c.want]
		if !pl.wants(s, c.want, (slot+1)*slotTime) {
			continue
		}
		length := p.Length(&w.Steps[0], s.id)
		first, row := p.Shelf.Row(scope.Class, int(s.night), w.Steps[0].Row)
		k := int(slot + (slotTime/2+length/2)/slotTime - int64(first))
		if k < 0 || k >= len(row) {
			continue
		}
		q := float64(row[k]) / 255
		if q < w.MinQuality {
			continue
		}
		q *= factor
		x := c.value*q - c.reserve
		if x <= 0 {
			continue
		}
		l := listed{cand: *c, quality: q, density: x / pl.st.busy[int(c.want)*len(p.Scopes)+int(s.id)]}
		pl.enlist(s, l)
	}
	mid := slot*slotTime + slotTime/2
	for i := range s.short {
		l := &s.short[i]
		w := &p.Wants[l.want]
		for k := range w.Steps {
			l.busy += model.Sec(p.Length(&w.Steps[k], s.id))
			if k > 0 {
				l.busy += model.Sec(scope.TypicalGap)
			}
		}
		l.dir = p.Direction(w, mid)
		var fr visibility.Frame
		l.to, fr = pl.sight(s, mid, l.dir)
		if scope.Mount != survey.Equatorial {
			l.to.HourAngle = fr.HourAngle(l.dir)
		}
	}
}

// enlist keeps the shortSize densest; the least of them stands first.
func (pl *Player) enlist(s *scope, l listed) {
	if len(s.short) < shortSize {
		s.short = append(s.short, l)
		if len(s.short) == shortSize {
			leastFirst(s.short)
		}
		return
	}
	if l.density > s.short[0].density {
		s.short[0] = l
		leastFirst(s.short)
	}
}

func leastFirst(a []listed) {
	k := 0
	for i := range a {
		if a[i].density < a[k].density {
			k = i
		}
	}
	a[0], a[k] = a[k], a[0]
}

// night is the stage's picture of the telescope's night.
func (pl *Player) night(s *scope) *stageNight {
	return &pl.st.nights[int(s.id)*pl.st.p.Nights+int(s.night)]
}

// candidates lists what could be taken in an hour, with what each visit would
// be worth later: in later nights (the want's multiplier), or in a later hour
// of this night at this telescope.
func (pl *Player) candidates(s *scope, block int32) {
	p, f := pl.st.p, pl.f
	s.block, s.cands = block, s.cands[:0]
	sn := pl.night(s)
	mean := pl.st.climates[s.site].MeanFactor() / 255
	for i := range sn.options {
		o := &sn.options[i]
		if block < int32(o.from) || block > int32(o.to) || f.left[o.want] <= 0 {
			continue
		}
		if pl.policy == AsPlanned && pl.lost[o.want] == 0 {
			continue
		}
		w := &p.Wants[o.want]
		c := cand{want: o.want, value: w.Value * pl.pressure[w.Program]}
		if b := p.Bonus(int(w.Field)); b > 0 {
			c.value += b / float64(max(1, pl.field[w.Field]))
		}
		if pl.policy == FixedPrices || pl.policy == Resolved {
			c.reserve = f.mu[o.want]
			busy := pl.st.busy[int(o.want)*len(p.Scopes)+int(s.id)]
			later := 0.0
			for b := block + 1; b <= int32(o.to); b++ {
				k := sn.block + b
				x := c.value*mean*float64(pl.st.qualities[o.at+b-int32(o.from)]) - f.price[k]*busy - c.reserve
				later = max(later, x*pl.staysOpen(s, k, b-block))
			}
			c.reserve = trust * (c.reserve + later)
		}
		s.cands = append(s.cands, c)
	}
}

// staysOpen is the chance that an hour is open, some hours after one that is:
// the chain's p + (1 - p) r^k.
func (pl *Player) staysOpen(s *scope, block, after int32) float64 {
	p := pl.st.climate[block]
	return p + (1-p)*pl.memory[s.site][min(int(after), len(pl.memory[s.site])-1)]
}
