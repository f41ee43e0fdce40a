package explain

import (
	"cmp"
	"fmt"
	"math"
	"slices"

	"nightwright/constraints"
	"nightwright/constraints/survey"
	"nightwright/scheduler/tables"
	"nightwright/visibility"
)

// fieldJob carries what the explanation of one field shares.
type fieldJob struct {
	in      Input
	field   int
	one     *survey.Survey // with this field alone
	sky     *visibility.Sky
	windows *constraints.Windows
	out     *Field
	nights  map[nightKey][]*tables.VisitRow // by telescope and night, by start
	bonus   map[string]float64              // C of finished fields' bonuses
	prices  map[string][]*tables.PriceRow   // by telescope, by slot
}

type nightKey struct {
	telescope string
	night     int32
}

// index sorts the plan's rows by telescope and night.
func (x *fieldJob) index() {
	sv := x.in.Survey
	x.nights, x.bonus, x.prices = map[nightKey][]*tables.VisitRow{}, map[string]float64{}, map[string][]*tables.PriceRow{}
	for i := range x.in.Plan.Visits {
		v := &x.in.Plan.Visits[i]
		k := nightKey{v.Telescope, v.Night}
		x.nights[k] = append(x.nights[k], v)
	}
	for _, rows := range x.nights { // each by itself
		slices.SortFunc(rows, func(a, b *tables.VisitRow) int { return cmp.Compare(a.Start, b.Start) })
	}
	for i := range x.in.Plan.Fields {
		if r := &x.in.Plan.Fields[i]; r.Bonus > 0 {
			x.bonus[r.Field] = r.Bonus * r.Weight / ((1 + sv.FinishBonus) * sv.TotalWeight())
		}
	}
	for i := range x.in.Plan.Prices {
		p := &x.in.Plan.Prices[i]
		x.prices[p.Telescope] = append(x.prices[p.Telescope], p)
	}
}

// shown is how many of the best windows are told.
const shown = 6

// lacking finds the best windows of a demand that lacks visits, one of each
// telescope-night, and tells why each lost, and what would help.
func (x *fieldJob) lacking(d int, g *Demand) {
	sv := x.in.Survey
	f := &sv.Fields[x.field]
	demand := &sv.Programs[f.Program].Demands[d]
	var all []Window
	for t := range sv.Telescopes {
		if !sv.Qualifies(f, demand, t) {
			continue
		}
		for n := range sv.Nights() {
			if w, ok := x.best(d, demand, t, n, g.Worth); ok {
				all = append(all, w)
			}
		}
	}
	slices.SortStableFunc(all, func(a, b Window) int { return cmp.Compare(b.Worth-b.rivals, a.Worth-a.rivals) })
	barred := 0
	factor := math.Inf(1)
	for i := range all {
		w := &all[i]
		x.judge(d, demand, w)
		switch w.Why {
		case Cadence:
			barred++
		case Taken:
			factor = min(factor, w.rivals/w.Worth)
		}
	}
	// Those within reach first: the ones that the field's own visits bar say less.
	told := slices.Clone(all)
	slices.SortStableFunc(told, func(a, b Window) int { return cmp.Compare(rank(a.Why), rank(b.Why)) })
	g.Windows = told[:min(shown, len(told))]
	x.helps(demand, g, barred, len(all), factor)
}

func rank(w Why) int {
	if w == Cadence || w == Over {
		return 1
	}
	return 0
}

// best finds the start in a telescope-night at which a visit comes nearest to
// outdoing what stands there. worth is that of a visit of quality 1.
func (x *fieldJob) best(d int, demand *survey.Demand, t, n int, worth float64) (Window, bool) {
	sv := x.in.Survey
	tel := &sv.Telescopes[t]
	rules := &sv.Fields[x.field].Rules[d]
	length := demand.Exposures[0].Duration * tel.ExposureScale
	out := Window{Telescope: tel.Name, Night: int32(sv.FirstNight) + int32(n), Quality: -1}
	for _, w := range x.windows.Of(x.windows.Unit(0, d), x.windows.Class(t), n) {
		in := x.windows.Interval(w)
		for _, o := range x.in.Calendar.Open(t, n) {
			from, to := max(in.From, o.From), min(in.To, o.To)-length
			if to < from {
				continue
			}
			const step = 300
			for k := 0; ; k++ {
				at := min(from+float64(k)*step, to)
				if q := x.quality(demand, tel, at); q >= rules.MinQuality {
					list, sum := x.rivalsOf(demand, tel, out.Night, at)
					if out.Quality < 0 || q*worth-sum > out.Worth-out.rivals {
						out.Quality, out.Best, out.From, out.To = q, at, from, to+length
						out.Worth, out.Rivals, out.rivals = q*worth, list, sum
					}
				}
				if at == to {
					break
				}
			}
		}
	}
	return out, out.Quality >= 0
}

// rivalsOf lists the visits that stand where those of a visit from an instant
// on would, each with a readout between, and sums up what they are worth.
func (x *fieldJob) rivalsOf(demand *survey.Demand, tel *survey.Telescope, night int32, at float64) (list []Rival, sum float64) {
	rows := x.nights[nightKey{tel.Name, night}]
	for k := range demand.Exposures {
		at += demand.Exposures[k].After
		from, to := at-tel.Readout, at+demand.Exposures[k].Duration*tel.ExposureScale+tel.Readout
		i, _ := slices.BinarySearchFunc(rows, from-longest, func(v *tables.VisitRow, t float64) int { return cmp.Compare(float64(v.Start)/1e6, t) })
		for ; i < len(rows) && float64(rows[i].Start)/1e6 < to; i++ {
			v := rows[i]
			if float64(v.End)/1e6 <= from || slices.ContainsFunc(list, func(r Rival) bool { return r.Visit == v.Visit }) {
				continue
			}
			r := Rival{v.Field, v.Visit, v.Start, v.Credit + x.bonus[v.Field]}
			list = append(list, r)
			sum += r.Worth
		}
	}
	return list, sum
}

// longest is how far before an instant an exposure that reaches into it may
// start, s.
const longest = 6 * 3600

// quality is the mean over the demand's exposures, at their wanted times.
func (x *fieldJob) quality(demand *survey.Demand, tel *survey.Telescope, at float64) float64 {
	sum := 0.0
	for k := range demand.Exposures {
		e := &demand.Exposures[k]
		at += e.After
		mid := at + e.Duration*tel.ExposureScale/2
		fr := x.sky.Frame(tel.Site, mid)
		sum += x.sky.Quality(&fr, e.Filter, x.sky.Direction(0, mid))
	}
	return sum / float64(len(demand.Exposures))
}

// judge tells why a window has no visit of the demand.
func (x *fieldJob) judge(d int, demand *survey.Demand, w *Window) {
	tel := x.telescope(w.Telescope)
	at := w.Best
	for k := range demand.Exposures {
		at += demand.Exposures[k].After
		to := at + demand.Exposures[k].Duration*tel.ExposureScale + tel.Readout
		for _, p := range x.prices[w.Telescope] {
			s := float64(p.SlotStart) / 1e6
			if both := min(to, s+x.in.Survey.Slot) - max(at, s); both > 0 {
				w.Price += both / 3600 * p.PricePerHour
			}
		}
	}
	near, same := x.near(demand, w)
	switch {
	case w.Best*1e6 < float64(x.in.Now):
		w.Why = Over
	case near != 0 || demand.PerNight > 0 && same >= demand.PerNight:
		w.Why, w.Near = Cadence, near
	case len(w.Rivals) == 0 && w.Price > w.Worth:
		w.Why = Priced
	case len(w.Rivals) == 0:
		w.Why = Empty
	case w.rivals >= w.Worth:
		w.Why = Taken
	case w.Price > w.Worth:
		w.Why = Priced
	default:
		w.Why = Cheaper
	}
}

// near returns the start of a visit of the same demand that is too near, and
// how many there are of the window's night.
func (x *fieldJob) near(demand *survey.Demand, w *Window) (start int64, same int) {
	sets := map[nightKey]bool{}
	for _, v := range x.out.Visits {
		key := nightKey{v.Telescope, v.Night}
		if v.Demand != demand.Name || v.Credit == 0 && v.State != "done" || demand.IsSet() && sets[key] {
			continue
		}
		sets[key] = true
		if start == 0 && math.Abs(float64(v.Start)/1e6-w.Best) < demand.GapMin {
			start = v.Start
		}
		if v.Night == w.Night {
			same++
		}
	}
	return start, same
}

func (x *fieldJob) telescope(name string) *survey.Telescope {
	for i := range x.in.Survey.Telescopes {
		if x.in.Survey.Telescopes[i].Name == name {
			return &x.in.Survey.Telescopes[i]
		}
	}
	return nil
}

// helps lists what would get the field more, the most telling first.
func (x *fieldJob) helps(demand *survey.Demand, g *Demand, barred, all int, factor float64) {
	if all == 0 {
		g.Helps = append(g.Helps, Help{What: "no window holds an exposure: a looser rule, or another telescope"})
	}
	if barred > 0 && 2*barred >= all {
		g.Helps = append(g.Helps, Help{What: fmt.Sprintf("a gap.min under %s, or more per_night: it bars %d of %d nights", hoursText(demand.GapMin), barred, all)})
	}
	if !math.IsInf(factor, 1) && factor > 0 {
		g.Helps = append(g.Helps, Help{What: "a greater weight, or a lower one of those that stand there", Factor: max(factor, 1)})
	}
	loosest := slices.Clone(g.Rules)
	slices.SortStableFunc(loosest, func(a, b RuleHours) int { return cmp.Compare(b.Only, a.Only) })
	for i, r := range loosest {
		if i < 3 && r.Only > 0 {
			g.Helps = append(g.Helps, Help{What: "without the rule " + r.Rule, Hours: r.Only})
		}
	}
}

func hoursText(s float64) string { return fmt.Sprintf("%.3g h", s/3600) }
