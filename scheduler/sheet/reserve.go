package sheet

import (
	"cmp"
	"context"
	"fmt"
	"math"
	"slices"

	"nightwright/constraints"
	"nightwright/constraints/survey"
	"nightwright/scheduler/tables"
	"nightwright/visibility"
)

// Spare is a visit that isn't planned for the night and may be taken when the
// plan breaks.
type Spare struct {
	Field, Program, Demand, Filter string
	RA, Dec                        float64 // deg
	Exposure                       float64 // s, of the first exposure
	Exposures                      int     // of a set; 1 without sets
	From, To                       float64 // starts that end in its window, Unix s
	Quality                        float64 // at the best of them
	Best                           float64 // that start
	PerHour                        float64 // C an hour of exposure and readout: what its time is worth
}

// spareStep is the step at which starts are tried, s.
const spareStep = 600

// Reserve lists what a telescope may take in a night instead of its plan, that
// worth most for its time first, at most so many: visits of demands that aren't
// all done, within their rules at the start given, and no nearer than gap.min (or
// more a night than per_night) to any other visit of theirs in the plan.
func Reserve(ctx context.Context, sv *survey.Survey, exact *visibility.Exact, losses [][]visibility.Interval, pt *tables.PlanTables, ask Ask, most, workers int) ([]Spare, error) {
	t := slices.IndexFunc(sv.Telescopes, func(t survey.Telescope) bool { return t.Name == ask.Telescope })
	if t < 0 || ask.Night < sv.FirstNight || ask.Night > sv.LastNight {
		return nil, nil
	}
	// Of one night the sky is soon worked out, whatever the number of fields.
	night := *sv
	night.FirstNight, night.LastNight = ask.Night, ask.Night
	cal := constraints.NewCalendar(&night, exact, losses)
	sky := constraints.Tables(&night, exact, workers)
	win, err := constraints.NewWindows(ctx, &night, sky, cal, workers)
	if err != nil {
		return nil, err
	}
	own := map[string][]*tables.VisitRow{}
	for i := range pt.Visits {
		v := &pt.Visits[i]
		own[v.Field] = append(own[v.Field], v)
	}
	done := map[[2]string]bool{}
	for i := range pt.Demands {
		r := &pt.Demands[i]
		done[[2]string{r.Field, r.Demand}] = r.Done >= r.Wanted
	}
	var out []Spare
	total := sv.TotalWeight()
	for f := range sv.Fields {
		fd := &sv.Fields[f]
		p := &sv.Programs[fd.Program]
		for d := range p.Demands {
			dm := &p.Demands[d]
			if done[[2]string{fd.Name, dm.Name}] || !sv.Qualifies(fd, dm, t) {
				continue
			}
			s := Spare{
				Field: fd.Name, Program: p.Name, Demand: dm.Name, Filter: sv.Filters[dm.Exposures[0].Filter].Name, RA: degrees(fd.RA), Dec: degrees(fd.Dec),
				Exposure: dm.Exposures[0].Duration * sv.Telescopes[t].ExposureScale, Exposures: len(dm.Exposures), Quality: -1,
			}
			x := spareJob{&night, sky, cal, win, f, d, t, own[fd.Name]}
			if x.look(&s); s.Quality < fd.Rules[d].MinQuality {
				continue
			}
			value := sv.WeightOf(fd) / (float64(sv.Wanted(fd)) * (1 + sv.FinishBonus) * total)
			s.PerHour = value * s.Quality / x.time() * 3600
			out = append(out, s)
		}
	}
	slices.SortStableFunc(out, func(a, b Spare) int { return cmp.Compare(b.PerHour, a.PerHour) })
	return out[:min(most, len(out))], nil
}

func degrees(x float64) float64 { return x * (180 / math.Pi) }

// spareJob looks at one demand of one field.
type spareJob struct {
	sv      *survey.Survey // of the one night
	sky     *visibility.Sky
	cal     *constraints.Calendar
	win     *constraints.Windows
	f, d, t int
	own     []*tables.VisitRow
}

func (x *spareJob) demand() *survey.Demand {
	return &x.sv.Programs[x.sv.Fields[x.f].Program].Demands[x.d]
}

// span is how long a visit takes from its first start to its last end, s.
func (x *spareJob) span() float64 {
	sum := 0.0
	dm := x.demand()
	for k := range dm.Exposures {
		sum += dm.Exposures[k].After
	}
	return sum + dm.Exposures[len(dm.Exposures)-1].Duration*x.sv.Telescopes[x.t].ExposureScale
}

// time is what a visit takes of the telescope, s.
func (x *spareJob) time() float64 {
	sum := 0.0
	dm := x.demand()
	for k := range dm.Exposures {
		sum += dm.Exposures[k].Duration*x.sv.Telescopes[x.t].ExposureScale + x.sv.Telescopes[x.t].Readout
	}
	return sum
}

// look finds the longest stretch of legal starts, and the best of them.
func (x *spareJob) look(s *Spare) {
	tel := &x.sv.Telescopes[x.t]
	dm := x.demand()
	span := x.span()
	for _, w := range x.win.Of(x.win.Unit(x.f, x.d), x.win.Class(x.t), 0) {
		in := x.win.Interval(w)
		for _, o := range x.cal.Open(x.t, 0) {
			from, to := max(in.From, o.From), min(in.To, o.To)-span
			if to < from || to-from < s.To-s.From || x.barred(from, to) {
				continue
			}
			s.From, s.To, s.Quality = from, to, -1
			for k := 0; ; k++ {
				at := min(from+float64(k)*spareStep, to)
				mid := at + dm.Exposures[0].Duration*tel.ExposureScale/2
				fr := x.sky.Frame(tel.Site, mid)
				if q := x.sky.Quality(&fr, dm.Exposures[0].Filter, x.sky.Direction(x.f, mid)); q > s.Quality {
					s.Quality, s.Best = q, at
				}
				if at == to {
					break
				}
			}
		}
	}
}

// barred reports whether some start of a stretch breaks the cadence with the
// field's visits in the plan.
func (x *spareJob) barred(from, to float64) bool {
	dm := x.demand()
	same := 0
	for _, v := range x.own {
		if v.Demand != dm.Name {
			continue
		}
		if at := float64(v.Start) / 1e6; at > from-dm.GapMin && at < to+dm.GapMin {
			return true
		}
		if v.Night == int32(x.sv.FirstNight) {
			same++
		}
	}
	return dm.PerNight > 0 && same >= dm.PerNight || dm.IsSet() && same > 0
}

// reserveHead stands over the list.
const reserveHead = "In reserve, when the plan breaks: the best for their time first. Starts are UTC; what an hour is worth is in millionths of coverage."

// reserve writes the reserve list, two lines an entry.
func (s *Sheet) reserve() []string {
	var out []string
	for i := range s.Reserve {
		x := &s.Reserve[i]
		what := fmt.Sprintf("%s %s", x.Filter, seconds(x.Exposure))
		if x.Exposures > 1 {
			what = fmt.Sprintf("set of %d from %s %s", x.Exposures, x.Filter, seconds(x.Exposure))
		}
		out = append(out,
			fmt.Sprintf("%4s  %s  %s, %s", fmt.Sprintf("R%d", i+1), x.Field, x.Demand, what),
			fmt.Sprintf("      %s to %s, best %s, %.0f an hour  %s %s", clock(x.From)[:5], clock(x.To)[:5], clock(x.Best)[:5], 1e6*x.PerHour,
				visibility.FormatHours(x.RA*math.Pi/180, 1), visibility.FormatDegrees(x.Dec*math.Pi/180, 0)))
	}
	if len(out) > 0 {
		out = append(out, fmt.Sprintf("      (an hour of this night is worth %.0f in the plan)", 1e6*s.HourPrice))
	}
	return out
}
