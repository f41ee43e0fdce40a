package audit

import (
	"cmp"
	"context"
	"fmt"
	"math"
	"slices"

	"nightwright/constraints/survey"
	"nightwright/visibility"
)

// shot is one row with what it means in the survey, and what the exact sky
// says about it.
type shot struct {
	*Visit
	field, demand, step int // step -1: it can't be told which of a set's it is
	filter, scope, site int
	from, to            float64 // Unix s
	day                 survey.Day
	night               int // index of the true night in the period; -1: outside
	done                bool
	known               bool // the survey has all of its names
	start, middle, end  sight
	quality             float64
	sky                 float64 // mag/arcsec2
	gap                 float64 // needed before it, s
	counts              bool    // among the visits that earn
	unit                float64 // what its quality is multiplied with for its credit
	startTurn, endTurn  float64 // azimuth unwrapped along the track, rad
	breaches            []Breach
}

// case_ is one plan before the judge.
type trial struct {
	j        *Judge
	plan     Plan
	shots    []shot
	visits   []visit
	done     map[doneKey]float64
	breaches []Breach
	instants int64
}

type doneKey struct {
	telescope string
	start     int64
}

// Check judges a plan. It errs only when ctx ends.
func (j *Judge) Check(ctx context.Context, plan Plan) (*Report, error) {
	c := &trial{j: j, plan: plan, done: make(map[doneKey]float64, len(plan.Done))}
	for _, d := range plan.Done {
		c.done[doneKey{d.Telescope, d.Start}] = d.Quality
	}
	c.read()
	c.group()
	if err := c.expose(ctx); err != nil {
		return nil, err
	}
	c.sequences()
	c.cadence()
	score := c.score(nil)
	hours := c.hours()
	if !plan.LegalityOnly {
		c.numbers()
	}
	if plan.Totals != nil {
		c.totals(plan.Totals, score, hours)
	}
	r := &Report{Breaches: c.breaches, Exposures: len(c.shots), Visits: len(c.visits), Instants: c.instants, Score: score, Hours: hours.all}
	for i := range c.shots {
		r.Breaches = append(r.Breaches, c.shots[i].breaches...)
	}
	sortBreaches(r.Breaches)
	return r, nil
}

// breach notes a fault of an exposure.
func (s *shot) breach(rule string, measured, limit float64, unit, format string, args ...any) {
	s.breaches = append(s.breaches, Breach{
		Visit: s.Visit.Visit, Set: s.Set, Field: s.Field, Telescope: s.Telescope, Night: survey.Day(s.Night).String(),
		Rule: rule, Measured: measured, Limit: limit, Unit: unit, What: fmt.Sprintf(format, args...), at: s.Start,
	})
}

// read finds out what each row is about, in a fixed order of rows.
func (c *trial) read() {
	order := make([]int, len(c.plan.Visits))
	for i := range order {
		order[i] = i
	}
	rows := c.plan.Visits
	slices.SortFunc(order, func(x, y int) int {
		a, b := &rows[x], &rows[y]
		return cmp.Or(cmp.Compare(a.Start, b.Start), cmp.Compare(a.Telescope, b.Telescope), cmp.Compare(a.Visit, b.Visit),
			cmp.Compare(a.Set, b.Set), cmp.Compare(a.Field, b.Field), cmp.Compare(a.Demand, b.Demand), cmp.Compare(a.Filter, b.Filter),
			cmp.Compare(a.End, b.End), cmp.Compare(a.Night, b.Night), cmp.Compare(a.State, b.State))
	})
	c.shots = make([]shot, len(rows))
	seen := make(map[int64]bool, len(rows))
	for k, i := range order {
		s := &c.shots[k]
		s.Visit = &rows[i]
		s.from, s.to = float64(s.Start)/1e6, float64(s.End)/1e6
		s.step, s.night = -1, -1
		s.known = c.names(s)
		if seen[s.Visit.Visit] {
			s.breach(RuleVisitID, float64(s.Visit.Visit), 0, "", "the id %d is there twice", s.Visit.Visit)
		}
		seen[s.Visit.Visit] = true
		c.state(s)
		if s.End <= s.Start {
			s.breach(RuleLength, s.to-s.from, 0, "s", "it ends before it starts")
			s.known = false
		}
	}
}

// names looks up the row's names, and says which of them are wrong.
func (c *trial) names(s *shot) bool {
	sv, ok := c.j.sv, true
	look := func(kind, name string, in map[string]int) int {
		i, found := in[name]
		if !found {
			s.breach(RuleName, 0, 0, "", "the survey has no %s %q", kind, name)
			ok = false
		}
		return i
	}
	s.field = look("field", s.Field, c.j.fieldIDs)
	s.scope = look("telescope", s.Telescope, c.j.telescopeIDs)
	s.filter = look("filter", s.Filter, c.j.filterIDs)
	look("site", s.Site, c.j.siteIDs)
	program := look("program", s.Program, c.j.programIDs)
	if !ok {
		return false
	}
	if s.site = sv.Telescopes[s.scope].Site; sv.Sites[s.site].Name != s.Site {
		s.breach(RuleName, 0, 0, "", "telescope %s is at site %s, not at %s", s.Telescope, sv.Sites[s.site].Name, s.Site)
	}
	if own := sv.Fields[s.field].Program; own != program {
		s.breach(RuleName, 0, 0, "", "field %s belongs to program %s, not to %s", s.Field, sv.Programs[own].Name, s.Program)
		return false
	}
	s.demand = slices.IndexFunc(sv.Programs[program].Demands, func(d survey.Demand) bool { return d.Name == s.Demand })
	if s.demand < 0 {
		s.breach(RuleName, 0, 0, "", "program %s has no demand %q", s.Program, s.Demand)
		return false
	}
	return true
}

// state judges the row's state; what was done must stand in the ledger.
func (c *trial) state(s *shot) {
	switch s.State {
	case "planned", "held":
	case "done":
		s.done = true
		if _, ok := c.done[doneKey{s.Telescope, s.Start}]; !ok {
			s.breach(RuleState, 0, 0, "", "it is said to be done, and the ledger doesn't have it")
		}
	default:
		s.breach(RuleState, 0, 0, "", "its state is %q; want planned, held or done", s.State)
	}
}

func (c *trial) demand(s *shot) *survey.Demand {
	return &c.j.sv.Programs[c.j.sv.Fields[s.field].Program].Demands[s.demand]
}

// chunk is how many exposures, neighbours in time, are one piece of work.
const chunk = 128

// expose tests every exposure on the exact sky.
func (c *trial) expose(ctx context.Context) error {
	pieces := (len(c.shots) + chunk - 1) / chunk
	counts := make([]int64, pieces)
	err := c.j.share(ctx, pieces, func(p int) {
		for i := p * chunk; i < min((p+1)*chunk, len(c.shots)); i++ {
			if s := &c.shots[i]; s.known {
				c.findNight(s)
				counts[p] += c.j.test(s)
				if !s.done {
					c.closedTime(s)
					c.what(s)
				}
			}
		}
	})
	for _, n := range counts {
		c.instants += n
	}
	return err
}

// findNight finds the night in which an exposure lies, and holds its label
// against it. What follows goes by the true night.
func (c *trial) findNight(s *shot) {
	sv, nights := c.j.sv, c.j.nights[s.site]
	k, _ := slices.BinarySearchFunc(nights, s.from, func(n night, t float64) int {
		if n.to <= t {
			return -1
		}
		return 1
	})
	var in span
	switch {
	case k < len(nights) && nights[k].from <= s.from+rootSlack:
		s.night, s.day, in = k, sv.FirstNight+survey.Day(k), nights[k].span
	default: // outside the period
		day := survey.Day(math.Floor((s.from + sv.Sites[s.site].Longitude/(2*math.Pi)*86400 - 43200) / 86400))
		for day--; c.j.transit(s.site, day+1) <= s.from; {
			day++
		}
		s.day, in = day, span{c.j.transit(s.site, day), c.j.transit(s.site, day+1)}
	}
	// One that begins within the slack before a transit belongs to what follows.
	if s.night >= 0 && s.night+1 < len(nights) && in.to-s.from <= rootSlack && s.to > in.to+rootSlack {
		s.night, s.day, in = s.night+1, s.day+1, nights[s.night+1].span
	}
	if over := s.to - in.to; over > rootSlack {
		s.breach(RuleNight, over, 0, "s", "it goes on for %.3f s after the night of %v has ended", over, s.day)
	}
	if survey.Day(s.Night) != s.day {
		s.breach(RuleNight, float64(s.Night), float64(s.day), "", "its label is %v; it lies in the night of %v", survey.Day(s.Night), s.day)
	}
	if s.night < 0 && !s.done {
		s.breach(RulePeriod, 0, 0, "", "the night of %v is outside the survey's period, %v to %v", s.day, sv.FirstNight, sv.LastNight)
	}
}

// closedTime tests an exposure against closures, losses, reserved blocks and
// the field's dates.
func (c *trial) closedTime(s *shot) {
	f := &c.j.sv.Fields[s.field]
	if early := f.NotBefore - s.from; early > timeSlack*1e-6 {
		s.breach(RuleDates, early, 0, "s", "it starts %.3f s before the field's not_before", early)
	}
	if late := s.to - f.NotAfter; late > timeSlack*1e-6 {
		s.breach(RuleDates, late, 0, "s", "it ends %.3f s after the field's not_after", late)
	}
	if s.night < 0 {
		return
	}
	o := &c.j.open[s.scope][s.night]
	meets := func(rule string, list []span, slack float64, what string) {
		worst := 0.0
		for _, x := range list {
			worst = math.Max(worst, x.overlap(s.from, s.to))
		}
		if worst > slack {
			s.breach(rule, worst, 0, "s", "%.3f s of it lie in %s", worst, what)
		}
	}
	meets(RuleClosed, o.closed, timeSlack*1e-6, "a closure")
	meets(RuleLost, o.lost, timeSlack*1e-6, "lost time")
	meets(RuleReserved, o.reserved, rootSlack, "a reserved block")
}

// what tests who observes what for how long.
func (c *trial) what(s *shot) {
	if why := c.j.qualifies(s.field, s.demand, s.scope); why != "" {
		s.breach(RuleTelescope, 0, 0, "", "%s", why)
	}
	if s.step < 0 {
		return
	}
	x := &c.demand(s).Exposures[s.step]
	if x.Filter != s.filter {
		s.breach(RuleFilter, 0, 0, "", "its filter is %s; the demand asks for %s", s.Filter, c.j.sv.Filters[x.Filter].Name)
	}
	want := x.Duration * c.j.sv.Telescopes[s.scope].ExposureScale
	if got := s.End - s.Start; math.Abs(float64(got)-want*1e6) > 1 {
		s.breach(RuleLength, float64(got)/1e6, want, "s", "it takes %.6f s; exposure x exposure_scale is %.6f s", float64(got)/1e6, want)
	}
}

// geometry is what the sky's brightness depends on.
func (v *sight) geometry() visibility.Geometry {
	return visibility.Geometry{
		SinAltitude: v.star.Direction[2], SunAltitude: v.sun, MoonAltitude: v.moon,
		MoonSeparation: v.separation, MoonPhaseAngle: v.phase,
	}
}
