package scheduler

import (
	"cmp"
	"math"
	"slices"

	"nightwright/constraints/mount"
	"nightwright/constraints/survey"
	"nightwright/scheduler/model"
)

// Anatomy splits the gap between a ceiling and a plan into parts, in C. With
// the ceiling's prices lambda (Lagrangian duality; Geoffrion 1974),
//
//	ceiling - C = priced open time that no exposure and least gap takes
//	            + sum over fields of (the best a field could earn at these
//	              prices - what its visits in the plan earn at them)
//
// The first sum splits by what the time went to: Slews, Filters, Idle. Of the
// second, Moment is what the plan's visits would gain by moving, alone, to the
// best moment of their own windows on their own telescope and night, other
// visits being no obstacle, and each as far as half of the slack to its
// neighbours in the cadence, so that all could move together. What is left, Choice, is which nights and fields
// were chosen, the search's failures in that, and how far the ceiling itself is
// above the best plan; the parts of Choice can't be told apart without an exact
// optimum. The five sum to the gap.
type Anatomy struct {
	Slews   float64 // slews, settling and flips beyond the readout
	Filters float64 // filter changes
	Idle    float64 // priced open time in which nothing is done
	Moment  float64 // better moments of the visits' own nights
	Choice  float64 // nights and fields, search, and the ceiling's looseness
}

// Parts lists the anatomy as an outcome holds it.
func (a *Anatomy) Parts() []model.Part {
	return []model.Part{
		{Name: "slews", Worth: a.Slews}, {Name: "filter_changes", Worth: a.Filters}, {Name: "idle", Worth: a.Idle},
		{Name: "moment", Worth: a.Moment}, {Name: "choice", Worth: a.Choice},
	}
}

// Dissect works an anatomy out from a plan, its ceiling and the prices that
// prove it.
func Dissect(p *model.Problem, plan *model.Plan, coverage, ceiling float64, prices []model.Price) Anatomy {
	d := &dissector{p: p, slot: model.MicroOf(p.Survey.Slot)}
	d.setPrices(prices)
	byNight := make([][]visit, len(p.Scopes)*p.Nights)
	for _, v := range d.visits(plan) {
		k := int(v.Telescope)*p.Nights + int(v.Night)
		byNight[k] = append(byNight[k], v)
	}
	parts := make([]Anatomy, len(byNight))
	model.Parallel(p.Workers, len(parts), func(k int) { parts[k] = d.night(k, byNight[k]) })
	var a Anatomy
	for _, x := range parts {
		a.Slews += x.Slews
		a.Filters += x.Filters
		a.Idle += x.Idle
		a.Moment += x.Moment
	}
	a.Choice = ceiling - coverage - a.Slews - a.Filters - a.Idle - a.Moment
	return a
}

// dissector holds what the nights share.
type dissector struct {
	p     *model.Problem
	slot  int64
	first int64       // slot number of rate[scope][0]
	rate  [][]float64 // C per second
}

// visit is an exposure with the starts that its cadence leaves it.
type visit struct {
	model.Exposure
	want   *model.Want // nil: none that is known
	lo, hi int64
}

// visits gives each exposure half of the slack to its neighbours of the want.
func (d *dissector) visits(plan *model.Plan) []visit {
	out := make([]visit, len(plan.Exposures))
	of := make([][]int, len(d.p.Wants))
	for i, e := range plan.Exposures {
		out[i] = visit{e, nil, math.MinInt64, math.MaxInt64}
		for wi := d.p.FieldWant[e.Field]; wi < d.p.FieldWant[e.Field+1]; wi++ {
			if d.p.Wants[wi].Demand == e.Demand {
				out[i].want = &d.p.Wants[wi]
				of[wi] = append(of[wi], i) // plans are sorted by start
			}
		}
	}
	for wi, list := range of {
		for k := 1; k < len(list); k++ {
			a, b := &out[list[k-1]], &out[list[k]]
			half := max(0, b.Start-a.Start-d.p.Wants[wi].Spacing) / 2
			a.hi, b.lo = a.Start+half, b.Start-half
		}
	}
	return out
}

func (d *dissector) setPrices(prices []model.Price) {
	d.rate = make([][]float64, len(d.p.Scopes))
	if len(prices) == 0 {
		return
	}
	lo, hi := prices[0].SlotStart, prices[0].SlotStart
	for _, x := range prices {
		lo, hi = min(lo, x.SlotStart), max(hi, x.SlotStart)
	}
	d.first = lo * model.Micro / d.slot
	for t := range d.rate {
		d.rate[t] = make([]float64, hi*model.Micro/d.slot-d.first+1)
	}
	for _, x := range prices {
		d.rate[x.Telescope][x.SlotStart*model.Micro/d.slot-d.first] = x.PerHour / 3600
	}
}

// at is the price of a second at an instant.
func (d *dissector) at(scope int, us int64) float64 {
	k := us/d.slot - d.first
	if k < 0 || k >= int64(len(d.rate[scope])) {
		return 0
	}
	return d.rate[scope][k]
}

// cost is the price of the open time of a telescope-night in [from, to), C.
func (d *dissector) cost(scope, night int, from, to int64) float64 {
	var sum float64
	for _, o := range d.p.OpenOuter(scope, night) {
		for a, b := max(from, o.From), min(to, o.To); a < b; {
			end := min((a/d.slot+1)*d.slot, b)
			sum += d.at(scope, a) * model.Sec(end-a)
			a = end
		}
	}
	return sum
}

// night splits one telescope-night's time.
func (d *dissector) night(k int, list []visit) Anatomy {
	var a Anatomy
	scope, night := k/d.p.Nights, k%d.p.Nights
	open := d.p.OpenOuter(scope, night)
	if len(open) == 0 {
		return a
	}
	slices.SortFunc(list, func(x, y visit) int { return cmp.Compare(x.Start, y.Start) })
	from, to := open[0].From, open[len(open)-1].To
	idle := d.cost(scope, night, from, to) - d.kept(scope, night)
	least := d.p.Scopes[scope].LeastGap
	for i := range list {
		e := &list[i]
		end := e.End + least // the least gap is the visit's own
		idle -= d.cost(scope, night, e.Start, end)
		a.Moment += d.moment(e)
		if i+1 == len(list) {
			continue
		}
		plain, needed := d.gaps(&e.Exposure, &list[i+1].Exposure)
		slews, change := d.cost(scope, night, end, e.End+plain), d.cost(scope, night, e.End+plain, e.End+needed)
		a.Slews += slews
		a.Filters += change
		idle -= slews + change
	}
	a.Idle = math.Max(0, idle)
	return a
}

// kept is what keep_free takes off a night's priced time: nobody could fill it.
func (d *dissector) kept(scope, night int) float64 {
	if d.p.Scopes[scope].KeepFree == 0 {
		return 0
	}
	least := math.Inf(1)
	var open int64
	for _, o := range d.p.OpenOuter(scope, night) {
		open += o.To - o.From
		for at := o.From; at < o.To; at = (at/d.slot + 1) * d.slot {
			least = math.Min(least, d.at(scope, at))
		}
	}
	return least * math.Max(0, model.Sec(open-d.p.Budget(scope, night)-d.p.Scopes[scope].LeastGap))
}

// gaps returns what two exposures need between them, us, without a change of
// filter and with it.
func (d *dissector) gaps(from, to *model.Exposure) (plain, needed int64) {
	t := d.p.Scopes[from.Telescope].Telescope
	a, _ := d.point(from, from.End)
	b, east := d.point(to, to.Start)
	_, was := d.point(from, from.Start)
	fa, fb := d.filter(from), d.filter(to)
	plain = model.MicroOf(mount.Gap(t, a, b, fa, fa, was, east))
	needed = model.MicroOf(mount.Gap(t, a, b, fa, fb, was, east))
	return max(plain, d.p.Scopes[from.Telescope].LeastGap), max(needed, plain)
}

func (d *dissector) filter(e *model.Exposure) int {
	f := &d.p.Survey.Fields[e.Field]
	return d.p.Survey.Programs[f.Program].Demands[e.Demand].Exposures[e.Step].Filter
}

// point is where a telescope points at an exposure's field at an instant, and
// whether that is east of the meridian.
func (d *dissector) point(e *model.Exposure, us int64) (mount.Pointing, bool) {
	t := model.Sec(us)
	fr := d.p.Sky.Frame(int(d.p.Scopes[e.Telescope].Site), t)
	c := d.p.Sky.Direction(int(e.Field), t)
	h := fr.HourAngle(c)
	if d.p.Scopes[e.Telescope].Mount == survey.Equatorial {
		return mount.Pointing{HourAngle: h, Declination: fr.Declination(c)}, h < 0
	}
	alt, az := fr.AltAz(c)
	return mount.Pointing{Altitude: alt, Azimuth: az}, h < 0
}

// moment is what an exposure would gain at the ceiling's prices by moving to
// the best moment of its own night there, other visits being no obstacle. The
// moment is looked for in the shelf's steps and judged by its true quality. Sets
// stay where they are: their exposures are tied to each other.
func (d *dissector) moment(e *visit) float64 {
	w := e.want
	if e.Set != 0 || e.State != model.Planned || w == nil {
		return 0
	}
	scope, night := int(e.Telescope), int(e.Night)
	length := e.End - e.Start
	cost := func(at int64) float64 {
		return d.cost(scope, night, at, at+length+d.p.Scopes[scope].LeastGap)
	}
	worth := func(at int64) float64 {
		return w.Value*d.p.Quality(w, int(e.Step), e.Telescope, at+length/2) - cost(at)
	}
	own := worth(e.Start)
	best := own
	first, row := d.p.Shelf.Row(d.p.Scopes[scope].Class, night, w.Steps[e.Step].Row)
	guess, guessed := e.Start, math.Inf(-1)
	for _, win := range d.p.Windows.Of(int(w.Unit), int(d.p.Scopes[scope].Class), night) {
		wf, wt := d.p.Inward(win)
		for _, o := range d.p.Open(scope, night) {
			lo, hi := max(wf, o.From, e.lo), min(min(wt, o.To)-length, e.hi)
			if hi < lo {
				continue
			}
			best = math.Max(best, math.Max(worth(lo), worth(hi)))
			for i, q := range row {
				at := (int64(first)+int64(i))*model.ShelfStep*model.Micro - length/2
				if at < lo || at > hi {
					continue
				}
				if v := w.Value*float64(q)/255 - cost(at); v > guessed {
					guess, guessed = at, v
				}
			}
		}
	}
	return math.Max(best, worth(guess)) - own
}
