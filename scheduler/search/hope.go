package search

// Hope sets the part of its want's multiplier that a visit which has to leave is
// believed to get elsewhere, from 0 (nothing) to 1. With hope, moves may lower
// the coverage for the fields after them to raise; end without.
func (x *Search) Hope(part float64) { x.s.hope = part }

// parting is what a move that makes a visit leave is charged for it, C: its
// credit less what it is hoped to get elsewhere.
func (s *state) parting(v *visit) float64 {
	c := float64(v.credit) / scoreUnit
	if s.hope > 0 {
		c -= s.hope * min(s.mu[v.want], c)
	}
	return c
}

// hoped is what the visits that a transaction made leave are hoped to get
// elsewhere when their own fields are placed again, C.
func (s *state) hoped(field int) float64 {
	if s.hope == 0 {
		return 0
	}
	var sum float64
	for _, id := range s.undo.died {
		if v := &s.visits[id]; int(s.p.Wants[v.want].Field) != field {
			sum += float64(v.credit)/scoreUnit - s.parting(v)
		}
	}
	return sum
}
