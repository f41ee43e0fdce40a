package explain

import (
	"cmp"
	"context"
	"math"
	"slices"

	"nightwright/constraints"
	"nightwright/constraints/survey"
	"nightwright/scheduler/tables"
	"nightwright/visibility"
)

// Night is why one telescope's night looks as it does.
type Night struct {
	Site      string          `json:"site"`
	Telescope string          `json:"telescope"`
	Night     int32           `json:"night_days"` // days since 1970-01-01
	Row       tables.NightRow `json:"row"`
	MeanPrice float64         `json:"mean_price_per_hour"` // of the telescope over all its nights, weighed by open time, C per hour
	Budget    float64         `json:"budget_s"`            // what keep_free leaves, s
	KeepFree  float64         `json:"keep_free"`
	Shut      []Shut          `json:"shut"` // stretches of dark time that aren't open
	Idle      []Idle          `json:"idle"` // open stretches without exposures or the gaps that they need
	Programs  []Part          `json:"programs"`
	Cheapest  []Rival         `json:"cheapest"` // visits worth least by their time: the first to go
}

// Shut is a stretch of dark time that isn't open.
type Shut struct {
	visibility.Interval
	Why string `json:"why"`
}

// Idle is an open stretch that the plan leaves empty.
type Idle struct {
	visibility.Interval
	Lacking int     `json:"lacking"` // fields that lack visits and could be observed in it
	Barred  int     `json:"barred"`  // of those, such whose own visits are too near
	Field   string  `json:"field"`
	Worth   float64 `json:"worth"` // C of the best visit of those that aren't barred, its field being Field
}

// Part is what a program has of the night.
type Part struct {
	Program string  `json:"program"`
	Visits  int     `json:"visits"`
	Hours   float64 `json:"hours"` // of exposures
	Credit  float64 `json:"credit"`
}

// idleLeast is the shortest idle stretch that is told, s.
const idleLeast = 300

// ForNight explains one night of one telescope (indices of the survey).
func ForNight(ctx context.Context, in Input, telescope, night int) (*Night, error) {
	sv := in.Survey
	tel := &sv.Telescopes[telescope]
	out := &Night{
		Site: sv.Sites[tel.Site].Name, Telescope: tel.Name, Night: int32(sv.FirstNight) + int32(night),
		KeepFree: tel.KeepFree, Budget: in.Calendar.Budget(telescope, night),
	}
	price, open := 0.0, 0.0
	for i := range in.Plan.Nights {
		r := &in.Plan.Nights[i]
		if r.Telescope != tel.Name {
			continue
		}
		price += r.PricePerHour * r.OpenHours
		open += r.OpenHours
		if r.Night == out.Night {
			out.Row = *r
		}
	}
	if open > 0 {
		out.MeanPrice = price / open
	}
	x := &nightJob{in: in, t: telescope, n: night, out: out}
	x.shut()
	x.parts()
	return out, x.idle(ctx)
}

// nightJob carries what the explanation of one night shares.
type nightJob struct {
	in   Input
	t, n int
	out  *Night
	rows []*tables.VisitRow // of the night, by start
}

// shut lists what takes dark time away.
func (x *nightJob) shut() {
	sv := x.in.Survey
	tel := &sv.Telescopes[x.t]
	in := x.in.Calendar.Night(tel.Site, x.n)
	add := func(from, to float64, why string) {
		if from, to = max(from, in.From), min(to, in.To); to > from {
			x.out.Shut = append(x.out.Shut, Shut{visibility.Interval{From: from, To: to}, why})
		}
	}
	for _, c := range slices.Concat(sv.Sites[tel.Site].Closures, tel.Closures) {
		why := c.Why
		if why == "" {
			why = "no reason given"
		}
		switch label := sv.FirstNight + survey.Day(x.n); {
		case !c.ByNight:
			add(c.From, c.To, "closed: "+why)
		case c.FirstNight <= label && label <= c.LastNight:
			add(in.From, in.To, "closed: "+why)
		}
	}
	if x.in.Losses != nil {
		for _, l := range x.in.Losses[x.t] {
			add(l.From, l.To, "lost")
		}
	}
	for _, r := range x.in.Calendar.Reserved(x.t, x.n) {
		add(r.From, r.To, "reserved")
	}
	slices.SortStableFunc(x.out.Shut, func(a, b Shut) int { return cmp.Compare(a.From, b.From) })
}

// parts sums the night up by program, and finds the visits worth least.
func (x *nightJob) parts() {
	tel := x.in.Survey.Telescopes[x.t].Name
	at := map[string]int{}
	sets := map[int64]bool{}
	var all []Rival
	rate := map[int64]float64{}
	for i := range x.in.Plan.Visits {
		v := &x.in.Plan.Visits[i]
		if v.Telescope != tel || v.Night != x.out.Night {
			continue
		}
		x.rows = append(x.rows, v)
		k, ok := at[v.Program]
		if !ok {
			k = len(x.out.Programs)
			at[v.Program] = k
			x.out.Programs = append(x.out.Programs, Part{Program: v.Program})
		}
		p := &x.out.Programs[k]
		p.Hours += v.Exposure / 3600
		p.Credit += v.Credit
		if v.Set == 0 || !sets[v.Set] {
			p.Visits++
		}
		sets[v.Set] = true
		all = append(all, Rival{v.Field, v.Visit, v.Start, v.Credit})
		rate[v.Visit] = v.Credit / max(v.Exposure, 1e-9)
	}
	slices.SortFunc(x.rows, func(a, b *tables.VisitRow) int { return cmp.Compare(a.Start, b.Start) })
	slices.SortStableFunc(all, func(a, b Rival) int { return cmp.Compare(rate[a.Visit], rate[b.Visit]) })
	x.out.Cheapest = all[:min(3, len(all))]
}

// idle finds the empty stretches, and who could have used them.
func (x *nightJob) idle(ctx context.Context) error {
	for _, o := range x.in.Calendar.Open(x.t, x.n) {
		at := o.From
		for _, v := range x.rows {
			start, end := float64(v.Start)/1e6, float64(v.End)/1e6
			if end <= o.From || start >= o.To {
				continue
			}
			if start-v.GapBefore-at >= idleLeast {
				x.out.Idle = append(x.out.Idle, Idle{Interval: visibility.Interval{From: at, To: start - v.GapBefore}})
			}
			at = max(at, end)
		}
		if o.To-at >= idleLeast {
			x.out.Idle = append(x.out.Idle, Idle{Interval: visibility.Interval{From: at, To: o.To}})
		}
	}
	if len(x.out.Idle) == 0 {
		return nil
	}
	return x.claims(ctx)
}

// claims counts the fields that lack visits and could be observed in the idle
// stretches.
func (x *nightJob) claims(ctx context.Context) error {
	sv := x.in.Survey
	short := map[string]*tables.FieldRow{}
	for i := range x.in.Plan.Fields {
		if r := &x.in.Plan.Fields[i]; r.VisitsPlanned+r.VisitsDone < r.VisitsWanted {
			short[r.Field] = r
		}
	}
	part := *sv
	part.Fields = nil
	for i := range sv.Fields {
		if short[sv.Fields[i].Name] != nil {
			part.Fields = append(part.Fields, sv.Fields[i])
		}
	}
	if len(part.Fields) == 0 {
		return nil
	}
	// Of one night the sky is soon worked out, whatever the number of fields.
	night := *sv
	night.FirstNight += survey.Day(x.n)
	night.LastNight = night.FirstNight
	cal := constraints.NewCalendar(&night, x.in.Exact, x.in.Losses)
	part.FirstNight, part.LastNight = night.FirstNight, night.LastNight
	sky := constraints.Tables(&part, x.in.Exact, x.in.Workers)
	win, err := constraints.NewWindows(ctx, &part, sky, cal, x.in.Workers)
	if err != nil {
		return err
	}
	own := map[string][]*tables.VisitRow{}
	for i := range x.in.Plan.Visits {
		if v := &x.in.Plan.Visits[i]; short[v.Field] != nil {
			own[v.Field] = append(own[v.Field], v)
		}
	}
	lacks := map[[2]string]bool{}
	for i := range x.in.Plan.Demands {
		r := &x.in.Plan.Demands[i]
		lacks[[2]string{r.Field, r.Demand}] = r.Planned+r.Done < r.Wanted
	}
	for k := range x.out.Idle {
		for f := range part.Fields {
			x.claim(&x.out.Idle[k], &part, sky, win, f, lacks, own)
		}
	}
	return nil
}

// claim looks at one field for one idle stretch.
func (x *nightJob) claim(idle *Idle, part *survey.Survey, sky *visibility.Sky, win *constraints.Windows, f int, lacks map[[2]string]bool, own map[string][]*tables.VisitRow) {
	fd := &part.Fields[f]
	tel := &part.Telescopes[x.t]
	demands := part.Programs[fd.Program].Demands
	counted, barred, best := false, true, 0.0
	for d := range demands {
		dm := &demands[d]
		if !lacks[[2]string{fd.Name, dm.Name}] || !part.Qualifies(fd, dm, x.t) {
			continue
		}
		length := dm.Exposures[0].Duration * tel.ExposureScale
		at, ok := fit(win, win.Unit(f, d), win.Class(x.t), idle.Interval, length)
		if !ok {
			continue
		}
		counted = true
		if tooNear(dm, own[fd.Name], at, x.out.Night) {
			continue
		}
		barred = false
		mid := at + length/2
		fr := sky.Frame(tel.Site, mid)
		q := sky.Quality(&fr, dm.Exposures[0].Filter, sky.Direction(f, mid))
		sv := x.in.Survey
		best = math.Max(best, q*sv.WeightOf(fd)/(float64(sv.Wanted(fd))*(1+sv.FinishBonus)*sv.TotalWeight()))
	}
	if !counted {
		return
	}
	idle.Lacking++
	if barred {
		idle.Barred++
	} else if best > idle.Worth {
		idle.Worth, idle.Field = best, fd.Name
	}
}

// fit finds the first start of an exposure within a window and a stretch.
func fit(win *constraints.Windows, unit, class int, in visibility.Interval, length float64) (float64, bool) {
	for _, w := range win.Of(unit, class, 0) {
		iv := win.Interval(w)
		if from := max(iv.From, in.From); min(iv.To, in.To)-from >= length {
			return from, true
		}
	}
	return 0, false
}

// tooNear reports whether a start breaks the cadence with a field's own visits.
func tooNear(d *survey.Demand, own []*tables.VisitRow, at float64, night int32) bool {
	same := 0
	for _, v := range own {
		if v.Demand != d.Name {
			continue
		}
		if math.Abs(float64(v.Start)/1e6-at) < d.GapMin {
			return true
		}
		if v.Night == night {
			same++
		}
	}
	return d.PerNight > 0 && same >= d.PerNight
}
