package scheduler

import (
	"cmp"
	"context"
	"slices"

	"nightwright/scheduler/dual"
	"nightwright/scheduler/model"
	"nightwright/scheduler/search"
)

// Earlier is the plan that a re-plan starts from, in the ids of the survey as
// it is now; what the survey has no more is left out.
type Earlier struct {
	Exposures []model.Exposure // planned and held ones, with their numbers of visit and set
	Prices    []model.Price
	// Weights and Wanted are the fields' when that plan was made; NaN marks a
	// field that it didn't know.
	Weights []float64
	Wanted  []int32
	// OpenHours are those of each telescope-night [telescope*nights + night]
	// then; nil: unknown.
	OpenHours []float64
	Visit     int64 // greatest numbers in use, also of what was left out
	Set       int64
	Done      map[int64]bool // numbers of what was done when it was made
}

// ReplanParams steer a re-plan.
type ReplanParams struct {
	Hold       int64   // us after Past.From in which no visit is moved
	Stability  float64 // 0 to 1: what moving a planned visit is charged, in visits of mean worth
	Frontier   bool    // try five stabilities beside
	Seed       uint64
	CeilingBin float64 // start bins of the ceiling, s; 0: 600
	Progress   func(model.Progress)
}

// Replanned is a season planned again.
type Replanned struct {
	*model.Outcome         // its plan has what was done, what is held, and what is planned
	CeilingHeld    float64 // of all plans that agree with the ledger and keep what is held
	Before         float64 // coverage of what stood of the earlier plan, before anything was won back
	Changes        []Change
	Tally          Tally
	Frontier       []FrontierPoint
}

// Tally counts visits by what happened to them; sets count once.
type Tally struct {
	Done    int     // of the earlier plan, and outside of it
	Held    int     // inside the hold
	Kept    int     // held ones among them
	Lost    int     // not done, or in time that can't be used any more, or against the rules of now
	Dropped int     // made room for others
	Moved   int     // to another telescope or night
	Shifted int     // kept, with another start
	New     int     // of visits that had no place before
	LostC   float64 // C that the lost visits were worth
	WonC    float64 // C won back
}

// FrontierPoint says what one stability would have won and moved.
type FrontierPoint struct {
	Stability float64 `json:"stability"`
	Coverage  float64 `json:"coverage"`
	WonC      float64 `json:"credit_won"`
	Moved     int     `json:"visits_moved"` // dropped ones among them
	New       int     `json:"visits_new"`
}

// frontierSteps are the stabilities of a frontier.
var frontierSteps = []float64{0, 0.25, 0.5, 0.75, 1}

// near is how many nights are looked at first for what was lost.
const near = 7

// replanner carries what the steps of a re-plan share.
type replanner struct {
	ctx     context.Context
	in      Input
	old     *Earlier
	par     ReplanParams
	base    *model.Problem // of the whole survey
	p       *model.Problem // less what was done; what is under way may go on
	ph      *model.Problem // less what is held too
	visits  []oldVisit
	held    []int        // of visits
	rest    []int        // of visits, planned after the hold
	list    []search.Old // of rest
	s       *search.Search
	refused []search.Refusal // of rest
	mu      []float64
	planned map[int64]int32 // number to index of Earlier.Exposures
	doneAs  []int32         // of Earlier.Exposures: the done exposure that followed it; -1: none
}

// oldVisit is a visit of the earlier plan.
type oldVisit struct {
	exposures []int32 // of Earlier.Exposures, by start
	want      int32
	fate      fate
	why       search.Refusal
	begun     []int64 // starts as they were of the exposures of a set under way that are done
	worth     float64 // C
}

type fate uint8

const (
	stands fate = iota // planned still
	isHeld
	isDone
	isLost
)

// Replan plans the rest of a season again: what was done is taken as it is,
// visits that were missed or can't stand any more are looked for again, nothing
// inside the hold moves, and what is planned after it stays unless a visit that
// was lost is worth more than those that have to make room and what their moving
// is charged. It errs when the parts don't belong together.
func Replan(ctx context.Context, in Input, old *Earlier, par ReplanParams) (*Replanned, error) {
	if par.CeilingBin == 0 {
		par.CeilingBin = 600
	}
	if par.Progress == nil {
		par.Progress = func(model.Progress) {}
	}
	base, err := model.NewProblem(in.Survey, in.Sky, in.Calendar, in.Windows, in.Workers)
	if err != nil {
		return nil, err
	}
	r := &replanner{ctx: ctx, in: in, old: old, par: par, base: base}
	r.p = base.Take(in.Past.given(base))
	r.identify()
	r.group()
	r.sortOut()
	r.hold()
	ascent := dual.NewAscentAt(r.p, old.Prices)
	r.load(ascent)
	out := &Replanned{Before: r.s.Coverage()}
	r.tally(&out.Tally)
	if par.Frontier {
		out.Frontier = r.frontier(out.Before)
	}
	r.decide(par.Stability)
	out.Tally.WonC = r.s.Coverage() - out.Before
	r.finish(ascent, out)
	return out, nil
}

// group gathers the earlier plan's exposures into visits, by start.
func (r *replanner) group() {
	sets := map[int64]int{}
	for i := range r.old.Exposures {
		e := &r.old.Exposures[i]
		if k, ok := sets[e.Set]; ok && e.Set != 0 {
			r.visits[k].exposures = append(r.visits[k].exposures, int32(i))
			continue
		}
		sets[e.Set] = len(r.visits) // of single exposures nobody asks
		r.visits = append(r.visits, oldVisit{exposures: []int32{int32(i)}, want: r.p.WantOf(e.Field, e.Demand)})
	}
	for k := range r.visits {
		v := &r.visits[k]
		slices.SortFunc(v.exposures, func(a, b int32) int { return cmp.Compare(r.old.Exposures[a].Start, r.old.Exposures[b].Start) })
		w := &r.p.Wants[v.want]
		for j, i := range v.exposures {
			e := &r.old.Exposures[i]
			if j < len(w.Steps) {
				q := r.p.Quality(w, j, e.Telescope, (e.Start+e.End)/2)
				v.worth += w.Value * q / float64(len(w.Steps))
			}
		}
	}
	slices.SortStableFunc(r.visits, func(a, b oldVisit) int {
		return cmp.Compare(r.old.Exposures[a.exposures[0]].Start, r.old.Exposures[b.exposures[0]].Start)
	})
}

func (r *replanner) first(v *oldVisit) *model.Exposure { return &r.old.Exposures[v.exposures[0]] }
func (r *replanner) last(v *oldVisit) *model.Exposure {
	return &r.old.Exposures[v.exposures[len(v.exposures)-1]]
}

// sortOut tells what was done, what was missed, what the hold covers, and what
// is planned after it.
func (r *replanner) sortOut() {
	now := r.in.Past.From
	for k := range r.visits {
		v := &r.visits[k]
		switch {
		case r.wasDone(v):
			v.fate = isDone
		case r.last(v).End <= now:
			v.fate, v.why = isLost, search.Closed
		case r.first(v).Start < now:
			if v.begun = r.begun(v); v.begun == nil {
				v.fate, v.why = isLost, search.Closed
				continue
			}
			r.held = append(r.held, k)
		case r.first(v).Start < now+r.par.Hold:
			r.held = append(r.held, k)
		default:
			r.rest = append(r.rest, k)
		}
	}
}

// hold takes the visits of the hold, as far as they can stand, as given.
func (r *replanner) hold() {
	past := *r.in.Past
	under := map[int64]bool{} // exposures of sets under way: they are in the way of nobody
	var list []search.Old
	for _, k := range r.held {
		v := &r.visits[k]
		o := search.Old{Want: v.want, Scope: r.first(v).Telescope, Night: r.first(v).Night}
		for j, i := range v.exposures {
			start := r.old.Exposures[i].Start
			if j < len(v.begun) {
				start = v.begun[j]
				under[start] = true
			}
			o.Starts = append(o.Starts, start)
			past.From = min(past.From, start)
		}
		list = append(list, o)
	}
	given := past.given(r.base)
	given.Busy = slices.DeleteFunc(given.Busy, func(e model.Exposure) bool { return under[e.Start] })
	q := r.base.Take(given)
	zero := dual.NewPrices(q)
	refused := search.New(q, zero, make([]float64, len(q.Wants)), 0).Load(list)
	g, maybe := model.Given{Held: true}, model.Given{}
	for i, k := range r.held {
		v := &r.visits[k]
		if refused[i] != "" {
			v.fate, v.why = isLost, refused[i]
			continue
		}
		v.fate = isHeld
		r.give(&g, v)
		if r.first(v).Start < r.in.Past.From {
			last := g.Visits[len(g.Visits)-1]
			last.Maybe = true
			maybe.Visits = append(maybe.Visits, last)
		}
	}
	r.held = slices.DeleteFunc(r.held, func(k int) bool { return r.visits[k].fate != isHeld })
	r.ph = r.p.Take(g)
	if len(maybe.Visits) > 0 {
		r.p = r.p.Take(maybe)
	}
}

// qualityOver bounds the error of the fast sky's quality.
const qualityOver = 5e-5

// give adds a held visit to what is given. Its worth is rounded up, for it
// enters the ceiling.
func (r *replanner) give(g *model.Given, v *oldVisit) {
	e0 := r.first(v)
	gv := model.GivenVisit{
		Field: e0.Field, Demand: e0.Demand, Night: e0.Night, Start: e0.Start, Counts: true, Binds: true,
	}
	w := &r.p.Wants[v.want]
	for j, i := range v.exposures {
		e := r.old.Exposures[i]
		if j < len(v.begun) {
			gv.Quality += r.doneQuality(e.Telescope, v.begun[j]) / float64(len(v.exposures))
			continue
		}
		gv.Quality += min(1, r.p.Quality(w, j, e.Telescope, (e.Start+e.End)/2)+qualityOver) / float64(len(v.exposures))
		gv.Seconds += model.Sec(e.End - e.Start)
		g.Busy = append(g.Busy, e)
	}
	if len(v.begun) > 0 {
		gv.Start = v.begun[0]
	}
	g.Visits = append(g.Visits, gv)
}

func (r *replanner) doneQuality(telescope int32, start int64) float64 {
	for i := range r.in.Past.Exposures {
		if e := &r.in.Past.Exposures[i]; e.Telescope == telescope && e.Start == start {
			return e.Quality
		}
	}
	return 0
}

// load puts what is planned after the hold where it was.
func (r *replanner) load(ascent *dual.Ascent) {
	r.setMu(ascent)
	r.s = search.New(r.ph, ascent.Prices(), r.mu, r.par.Seed)
	r.list = make([]search.Old, len(r.rest))
	list := r.list
	for i, k := range r.rest {
		v := &r.visits[k]
		list[i] = search.Old{Want: v.want, Scope: r.first(v).Telescope, Night: r.first(v).Night}
		for _, x := range v.exposures {
			list[i].Starts = append(list[i].Starts, r.old.Exposures[x].Start)
		}
	}
	r.refused = r.s.Load(list)
	for i, k := range r.rest {
		if r.refused[i] != "" {
			r.visits[k].fate, r.visits[k].why = isLost, r.refused[i]
		}
	}
}

// setMu estimates the wants' count multipliers from the earlier plan: what the
// least worthy of its visits is worth over the price of its time.
func (r *replanner) setMu(ascent *dual.Ascent) {
	r.mu = make([]float64, len(r.p.Wants))
	count := make([]int32, len(r.p.Wants))
	for k := range r.visits {
		v := &r.visits[k]
		if v.fate == isDone || v.fate == isLost {
			continue
		}
		net := v.worth
		for _, i := range v.exposures {
			e := &r.old.Exposures[i]
			net -= ascent.Prices().Cost(int(e.Telescope), int(e.Night), e.Start, e.End+r.p.Scopes[e.Telescope].LeastGap)
		}
		if count[v.want] == 0 || net < r.mu[v.want] {
			r.mu[v.want] = max(0, net)
		}
		count[v.want]++
	}
	// The ceiling starts near where it will end: at what is got, and where nothing
	// is, at what others of the same worth get. Any start is right.
	guess := slices.Clone(r.mu)
	var ratios []float64
	for i := range r.mu {
		if count[i] > 0 {
			ratios = append(ratios, r.mu[i]/r.p.Wants[i].Value)
		}
		if count[i] < r.p.Wants[i].Visits {
			r.mu[i] = 0
		}
	}
	slices.Sort(ratios)
	for i := range guess {
		if count[i] == 0 && len(ratios) > 0 {
			guess[i] = ratios[len(ratios)/4] * r.p.Wants[i].Value
		}
	}
	ascent.StartMu(guess)
}

// tally counts what stood of the earlier plan, and what was lost of it, bonuses
// of fields that had all their visits and now haven't among it.
func (r *replanner) tally(t *Tally) {
	lost := make([]int32, len(r.in.Survey.Fields))
	for k := range r.visits {
		if v := &r.visits[k]; v.fate == isLost {
			lost[r.first(v).Field]++
		}
	}
	for f, n := range lost {
		if lack := r.s.Lack(f); n > 0 && n >= lack && lack > 0 {
			t.LostC += r.base.Bonus(f)
		}
	}
	for k := range r.visits {
		switch v := &r.visits[k]; v.fate {
		case isLost:
			t.Lost++
			t.LostC += v.worth
		case isHeld:
			t.Held++
		}
	}
	t.Done = len(r.in.Past.Visits)
}
