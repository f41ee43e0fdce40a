package ledger

import "slices"

// addLoss takes a row about time into what is known.
func (c *recording) addLoss(l *Loss) {
	c.lost = append(c.lost, l)
	if l.What == Lost {
		c.now = append(c.now, l)
		return
	}
	c.now = slices.DeleteFunc(c.now, func(o *Loss) bool {
		return o.Site == l.Site && (l.Telescope == "" || o.Telescope == l.Telescope) && l.Start <= o.Start && o.End <= l.End
	})
}

// takeTime takes one row about time; keyed tells whether its place and start
// stand for it, as in a file.
func (c *recording) takeTime(r *Row, keyed bool) {
	l, wrong := c.m.stretch(r)
	for _, tr := range wrong {
		c.add(r.Line, tr.want, "%s", tr.what)
	}
	if l == nil {
		return
	}
	touches := false
	for _, o := range c.lost {
		if o.same(l) && !(c.how.Correct && !slices.Contains(c.now, o)) {
			c.Seen++
			return
		}
		touches = touches || o.What == Lost && o.Site == l.Site && (o.Telescope == "" || l.Telescope == "" || o.Telescope == l.Telescope) && o.Start < l.End && l.Start < o.End
	}
	if l.What == Regained && !touches {
		c.add(r.Line, "want a stretch of it", "no time was recorded as lost there between %s and %s", Instant(l.Start), Instant(l.End))
		return
	}
	if keyed && !c.clearWay(r, l) {
		return
	}
	c.gone = append(c.gone, l)
	c.addLoss(l)
}

// clearWay takes back what a correction of lost time replaces: a stretch from
// the same place and start, or an exposure of that telescope and start. Without
// a correction either is a fault.
func (c *recording) clearWay(r *Row, l *Loss) bool {
	i := slices.IndexFunc(c.now, func(o *Loss) bool { return o.Site == l.Site && o.Telescope == l.Telescope && o.Start == l.Start })
	shot := c.last(key{l.Telescope, l.Start})
	if shot != nil && (shot.what == Withdraw || l.Telescope == "") {
		shot = nil
	}
	switch {
	case shot != nil && !c.how.Correct:
		c.add(r.Line, "want one of them; with --correct this takes the exposure back", "%s recorded an exposure at %s (%s)", l.Telescope, Instant(l.Start), c.place(shot))
		return false
	case i >= 0 && !c.how.Correct:
		c.add(r.Line, "want the same; or --correct", "the time lost at %s from %s is told otherwise: until %s, %s", l.Site, Instant(l.Start), Instant(c.now[i].End), c.now[i].Cause)
		return false
	}
	if shot != nil {
		c.withdraw(r, shot)
	}
	if i >= 0 {
		old := *c.now[i]
		old.What, old.Cause, old.Why, old.Row = Regained, "", r.Note, r.Line
		c.gone = append(c.gone, &old)
		c.addLoss(&old)
	}
	return true
}
