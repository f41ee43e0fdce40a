package sheet

import (
	"cmp"
	"fmt"
	"math"
	"slices"
	"strings"

	"nightwright/constraints"
	"nightwright/constraints/survey"
	"nightwright/scheduler/tables"
	"nightwright/visibility"
)

// builder works out the lines of one sheet.
type builder struct {
	sv               *survey.Survey
	exact            *visibility.Exact
	cal              *constraints.Calendar
	telescope, night int
	place            visibility.Site
	shots            []shot  // of this night, by start
	rivals           []rival // visits of the same fields and demands, by field, demand and start
}

// shot is one exposure of the night with its ids.
type shot struct {
	row                 *tables.VisitRow
	field, demand, step int
	start, length       float64 // s
}

// rival is the start of a visit, for cadence.
type rival struct {
	field, demand int
	start         float64
}

// take finds the night's exposures in a plan, and all visits of their fields.
func (b *builder) take(pt *tables.PlanTables) error {
	fields := map[string]int{}
	for i := range b.sv.Fields {
		fields[b.sv.Fields[i].Name] = i
	}
	label := int32(b.sv.FirstNight) + int32(b.night)
	here := map[int]bool{}
	for i := range pt.Visits {
		r := &pt.Visits[i]
		if r.Telescope != b.sv.Telescopes[b.telescope].Name || r.Night != label {
			continue
		}
		f, d, err := b.ids(fields, r)
		if err != nil {
			return err
		}
		here[f] = true
		b.shots = append(b.shots, shot{row: r, field: f, demand: d, start: float64(r.Start) / 1e6, length: float64(r.End-r.Start) / 1e6})
	}
	slices.SortStableFunc(b.shots, func(x, y shot) int { return cmp.Compare(x.start, y.start) })
	seen := map[int64]bool{}
	for i := range pt.Visits {
		r := &pt.Visits[i]
		if f, ok := fields[r.Field]; !ok || !here[f] || seen[r.Set] && r.Set != 0 {
			continue
		}
		f, d, err := b.ids(fields, r)
		if err != nil {
			return err
		}
		seen[r.Set] = true
		b.rivals = append(b.rivals, rival{f, d, float64(r.Start) / 1e6})
	}
	slices.SortStableFunc(b.rivals, func(x, y rival) int {
		return cmp.Or(cmp.Compare(x.field, y.field), cmp.Compare(x.demand, y.demand), cmp.Compare(x.start, y.start))
	})
	b.setSteps()
	return nil
}

// ids finds a row's field and demand in the survey.
func (b *builder) ids(fields map[string]int, r *tables.VisitRow) (field, demand int, err error) {
	f, ok := fields[r.Field]
	if !ok {
		return 0, 0, fmt.Errorf("visit %d is of field %q, which the survey hasn't; want the survey that the plan was made for", r.Visit, r.Field)
	}
	demands := b.sv.Programs[b.sv.Fields[f].Program].Demands
	d := slices.IndexFunc(demands, func(d survey.Demand) bool { return d.Name == r.Demand })
	if d < 0 {
		return 0, 0, fmt.Errorf("visit %d is of demand %q, which field %q hasn't; want the survey that the plan was made for", r.Visit, r.Demand, r.Field)
	}
	return f, d, nil
}

// setSteps numbers the exposures of each set by their starts.
func (b *builder) setSteps() {
	next := map[int64]int{}
	for i := range b.shots {
		s := &b.shots[i]
		if s.row.Set != 0 {
			last := len(b.demand(s).Exposures) - 1
			s.step = min(next[s.row.Set], last)
			next[s.row.Set]++
		}
	}
}

func (b *builder) demand(s *shot) *survey.Demand {
	return &b.sv.Programs[b.sv.Fields[s.field].Program].Demands[s.demand]
}

// lines puts exposures and reserved blocks in order.
func (b *builder) lines() []Line {
	var out []Line
	filter := firstFilter
	for i := range b.shots {
		s := &b.shots[i]
		l := Line{Start: s.start, End: s.start + s.length, Order: i + 1, Visit: s.row}
		if s.row.Set != 0 {
			l.Step, l.Steps = s.step+1, len(b.demand(s).Exposures)
		}
		if s.row.Filter != filter {
			l.FilterBefore = filter
			filter = s.row.Filter
		}
		l.Latest, l.LatestBy = b.latest(i)
		out = append(out, l)
	}
	for _, r := range b.cal.Reserved(b.telescope, b.night) {
		out = append(out, Line{Start: r.From, End: r.To, Reserved: b.reservedFor(r)})
	}
	slices.SortStableFunc(out, func(x, y Line) int { return cmp.Compare(x.Start, y.Start) })
	for i := range out {
		out[i].SiderealTime = b.exact.At(out[i].Start).SiderealTime(b.place.Longitude)
	}
	return out
}

// reservedFor says what a stretch of reserved time is for; blocks that touch
// are one stretch.
func (b *builder) reservedFor(x visibility.Interval) string {
	blocks := b.cal.Reserved(b.telescope, b.night)
	open := b.cal.Open(b.telescope, b.night)
	first, last := blocks[0].From, blocks[len(blocks)-1].To
	if len(open) > 0 {
		first, last = min(first, open[0].From), max(last, open[len(open)-1].To)
	}
	const rounding = 1e-3 // s
	var why []string
	for _, r := range b.sv.Telescopes[b.telescope].Reserved {
		in := false
		switch r.At {
		case survey.AtOpening:
			in = x.From < first+rounding
		case survey.AtClosing:
			in = x.To > last-rounding
		case survey.AtEvery:
			if r.Every > 0 {
				// The last multiple that starts before the stretch ends.
				k := math.Floor((x.To - rounding - first) / r.Every)
				in = k >= 1 && first+k*r.Every > x.From-rounding
			}
		}
		if name := r.Why; in && !slices.Contains(why, name) && name != "" {
			why = append(why, name)
		}
	}
	if len(why) == 0 {
		return "reserved"
	}
	return strings.Join(why, ", ")
}
