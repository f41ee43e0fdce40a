package search

import (
	"context"
	"slices"
)

// Within says where WinBack looks.
type Within struct {
	From, To int    // nights [From, To), indices
	Only     []bool // only these telescope-nights [telescope*nights + night]; nil: all
}

// WinBack adds visits that fields lack, in the order given, without moving the
// fields' own visits; others make room where that pays for what they are worth
// and for the charge of taking them out. It returns the fields whose visits made
// room, each once, by their first.
func (x *Search) WinBack(ctx context.Context, fields []int, theta float64, in Within) []int {
	s, pl := x.s, x.pl
	s.theta = theta
	pl.from, pl.to = max(0, in.From), min(s.p.Nights, in.To)
	defer func() { pl.from, pl.to, pl.only = 0, s.p.Nights, nil }()
	if pl.to <= pl.from {
		return nil
	}
	pl.only = in.Only
	var displaced []int
	for i, f := range fields {
		if i%16 == 0 && ctx.Err() != nil {
			break
		}
		displaced = pl.add(f, displaced)
		if invariants {
			s.verify()
		}
	}
	return displaced
}

// add fills what a field lacks, keeps it when the plan is better for it, and
// appends the fields of displaced visits.
func (pl *placer) add(field int, displaced []int) []int {
	s := pl.s
	lack := s.wanted[field] - s.got[field]
	if lack <= 0 {
		return displaced
	}
	s.stats.Placed++
	try := func(extra float64) float64 {
		s.begin()
		for wi := s.p.FieldWant[field]; wi < s.p.FieldWant[field+1]; wi++ {
			pl.fill(int(wi), extra)
		}
		return pl.objective()
	}
	before := pl.objective()
	after := try(0)
	if bonus := s.p.Bonus(field); bonus > 0 && s.got[field] < s.wanted[field] && 4*s.got[field] >= 3*s.wanted[field] {
		s.rollback()
		if forced := try(bonus / float64(lack)); forced > after {
			after = forced
		} else {
			s.rollback()
			after = try(0)
		}
	}
	if after <= before {
		s.rollback()
		s.stats.Undone++
		return displaced
	}
	for _, id := range s.undo.died {
		if f := int(s.p.Wants[s.visits[id].want].Field); f != field && !slices.Contains(displaced, f) {
			displaced = append(displaced, f)
		}
	}
	s.commit()
	s.stats.Better++
	return displaced
}

// Lacking lists the fields that lack visits, most valuable time first.
func (x *Search) Lacking() []int {
	var out []int
	for _, f := range x.byWorth() {
		if x.s.got[f] < x.s.wanted[f] {
			out = append(out, f)
		}
	}
	return out
}

// Lack returns how many visits a field lacks.
func (x *Search) Lack(f int) int32 { return x.s.wanted[f] - x.s.got[f] }

// ByWorth puts fields (ascending) in the order of their value by time.
func (x *Search) ByWorth(fields []int) []int {
	return slices.DeleteFunc(x.byWorth(), func(f int) bool {
		_, ok := slices.BinarySearch(fields, f)
		return !ok
	})
}

// Keep returns a copy of the state that Return goes back to.
func (x *Search) Keep() func() {
	kept, charged := x.s.snapshot(), x.s.charged
	mu := slices.Clone(x.pl.mu)
	return func() {
		x.s.restore(kept)
		x.s.charged = charged
		copy(x.pl.mu, mu)
	}
}

// Trim drops visits of programs over their greatest share.
func (x *Search) Trim() {
	longest := x.p.LongestVisits()
	// Trimming one program shrinks the whole and can push another over: until
	// none is. Each round drops a visit, so this ends.
	for again := true; again; {
		again = false
		for p := range x.s.rates {
			again = x.trim(int32(p), longest[p]) || again
		}
	}
}
