package seasons

import (
	"math"
	"slices"

	"nightwright/constraints/mount"
	"nightwright/scenarios/weather"
	"nightwright/scheduler/model"
	"nightwright/visibility/ephemeris"
)

// Policy is a way of acting through a season.
type Policy uint8

// The policies.
const (
	// AsPlanned follows the plan's lists; time that they leave free goes to what
	// clouds took and to what the plan left out.
	AsPlanned Policy = iota + 1
	// FixedPrices takes the visit worth most of its time, against prices that
	// were set before the season.
	FixedPrices
	// Resolved does the same against prices that are worked out anew each
	// evening, from what is left and the sky of the hour.
	Resolved
	// Densest takes what is worth most of its time now, with no thought of later.
	Densest
)

// Policies lists the policies by the words for them.
var Policies = []struct {
	Word   string
	Policy Policy
}{{"planned", AsPlanned}, {"fixed", FixedPrices}, {"resolved", Resolved}, {"densest", Densest}}

// String returns the policy's word.
func (p Policy) String() string {
	for _, x := range Policies {
		if x.Policy == p {
			return x.Word
		}
	}
	return "unknown"
}

// Outcome is what a season gave.
type Outcome struct {
	Season   int
	Coverage float64   // C
	Visits   int       // that count
	Finished int       // fields with every visit
	Nights   []float64 // C at the end of each night label
	Finish   []int32   // by field: label (index) at which it got its last visit; -1: never
	Open     float64   // h of telescopes' open time
	Lost     float64   // h of it under a closed sky
	Used     float64   // h of exposures that count and the gaps before them
	Wasted   float64   // h of exposures that clouds broke off, and of sets that were not ended
	Credit   []float64 // by site, with Strengths: C by bin
	Taken    []model.Exposure
}

// Player plays seasons on a stage. It is for one goroutine.
type Player struct {
	st     *Stage
	policy Policy
	active []bool
	base   *fluid // prices before the season, of all players
	f      *fluid
	sky    *weather.Sky
	lists  *planned // of AsPlanned
	record bool
	down   outage

	label    int32 // latest night label that began
	last     []int64
	nightOf  []int32 // [want] label of the last visit
	tonight  []int32 // [want] visits with that label
	field    []int32 // [field] visits left
	lost     []int32 // [want] visits for free time: what clouds took and the plan left out
	next     []int32 // [want] the next of the planned starts
	earned   []float64
	finish   []int32
	programs []float64 // exposure time got, s
	pressure []float64 // [program] what shares make of its values
	scopes   []scope
	out      *Outcome
	bins     *binning
	memory   [][]float64 // by site: the correlation of hours so many apart
}

// outage shuts one site for a stretch of night labels.
type outage struct {
	site     int // -1: none
	from, to int32
}

// scope is one telescope in real time.
type scope struct {
	id, site int32
	night    int32 // label (index); Nights when the season is over
	span     int   // open interval of the night
	ready    int64 // free from here on, us
	at       int64 // when it next acts
	used     int64 // exposures and gaps of the night, us
	has      bool  // an exposure was taken this night
	to       mount.Pointing
	filter   int
	east     bool
	pending  []commit // by latest start; AsPlanned: the night's list too
	block    int32    // of the candidates; -1: none
	cands    []cand
	slot     int64 // of the shortlist
	short    []listed
}

// commit is an exposure that must follow: the next step of a set that is
// begun, or one of a plan's list.
type commit struct {
	want             int32
	step             int32
	earliest, latest int64
	set              *begun // nil for single exposures of a list
}

// begun is a set under way.
type begun struct {
	want    int32
	before  int64 // last start before this one
	quality float64
	time    int64 // exposures so far, us
	taken   []model.Exposure
	planned bool // from a plan's list
	claimed bool
	dead    bool
}

// cand is a want that the telescope could serve in the present hour.
type cand struct {
	want    int32
	value   float64 // C of a visit at quality 1
	reserve float64 // C: what it is worth later
}

// listed is a candidate of the present slot.
type listed struct {
	cand
	quality float64 // of the slot
	density float64
	busy    float64 // s of exposures
	dir     ephemeris.Vec
	to      mount.Pointing
}

// newPlayer makes a player; base is solved or filled from a plan's prices.
func newPlayer(st *Stage, policy Policy, active []bool, base *fluid, lists *planned) *Player {
	p := st.p
	n := len(p.Wants)
	pl := &Player{
		st: st, policy: policy, active: active, base: base, lists: lists,
		sky:  weather.NewSky(st.climates, st.first, st.hours),
		f:    newFluid(st, active),
		last: make([]int64, n), nightOf: make([]int32, n), tonight: make([]int32, n), field: make([]int32, len(p.FieldWant)-1),
		lost: make([]int32, n), next: make([]int32, n), earned: make([]float64, p.Nights), finish: make([]int32, len(p.FieldWant)-1),
		programs: make([]float64, len(st.Survey.Programs)), pressure: make([]float64, len(st.Survey.Programs)),
		scopes: make([]scope, len(p.Scopes)), down: outage{site: -1},
	}
	for i := range st.climates {
		row := make([]float64, 25)
		for k := range row {
			row[k] = math.Pow(st.climates[i].Keep(), float64(k))
		}
		pl.memory = append(pl.memory, row)
	}
	return pl
}

// Play plays season k of a seed.
func (pl *Player) Play(seed uint64, k int) *Outcome {
	pl.sky.Draw(seed, uint64(k))
	pl.reset(k)
	for {
		s := pl.earliest()
		if s == nil {
			break
		}
		if s.night > pl.label {
			pl.evening(s.night, s.at)
		}
		pl.act(s)
		pl.settle(s)
	}
	sum := 0.0
	for n, x := range pl.earned {
		sum += x
		pl.out.Nights[n] = sum
	}
	pl.out.Coverage = sum
	copy(pl.out.Finish, pl.finish)
	pl.hours()
	slices.SortFunc(pl.out.Taken, func(a, b model.Exposure) int {
		if a.Start != b.Start {
			if a.Start < b.Start {
				return -1
			}
			return 1
		}
		return int(a.Telescope - b.Telescope)
	})
	return pl.out
}

func (pl *Player) reset(k int) {
	p := pl.st.p
	pl.out = &Outcome{Season: k, Nights: make([]float64, p.Nights), Finish: make([]int32, len(pl.finish))}
	if pl.bins != nil {
		pl.out.Credit = make([]float64, len(pl.st.Survey.Sites)*pl.bins.n)
	}
	pl.label = -1
	for w := range p.Wants {
		pl.last[w], pl.nightOf[w], pl.tonight[w] = math.MinInt64/2, -1, 0
		pl.f.left[w], pl.lost[w], pl.next[w] = p.Wants[w].Visits, 0, 0
		if pl.lists != nil { // what the plan leaves out may go into free time
			pl.lost[w] = max(0, p.Wants[w].Visits-int32(len(pl.lists.starts[w])))
		}
	}
	for f := range pl.field {
		pl.field[f], pl.finish[f] = int32(pl.st.Survey.Wanted(&pl.st.Survey.Fields[f])), -1
	}
	clear(pl.earned)
	clear(pl.programs)
	for i := range pl.pressure {
		pl.pressure[i] = 1
	}
	pl.f.copyFrom(pl.base)
	for t := range pl.scopes {
		s := &pl.scopes[t]
		*s = scope{id: int32(t), site: p.Scopes[t].Site, night: -1, block: -1, pending: s.pending[:0], cands: s.cands[:0], short: s.short[:0]}
		pl.nextNight(s)
		pl.settle(s)
	}
}

// copyFrom takes over prices, options and multipliers.
func (f *fluid) copyFrom(g *fluid) {
	copy(f.price, g.price)
	copy(f.chance, g.chance)
	clear(f.drift)
	copy(f.worth, g.worth)
	copy(f.odds, g.odds)
	copy(f.where, g.where)
	copy(f.who, g.who)
	copy(f.mu, g.mu)
	copy(f.boost, g.boost)
}

// earliest returns the telescope that acts next; nil at the season's end.
func (pl *Player) earliest() *scope {
	var first *scope
	for t := range pl.scopes {
		s := &pl.scopes[t]
		if int(s.night) < pl.st.p.Nights && (first == nil || s.at < first.at) {
			first = s
		}
	}
	return first
}

// nextNight moves a telescope to its next night with open time.
func (pl *Player) nextNight(s *scope) {
	p := pl.st.p
	pl.drop(s)
	for s.night++; int(s.night) < p.Nights; s.night++ {
		down := int(s.site) == pl.down.site && s.night >= pl.down.from && s.night < pl.down.to
		if open := p.Open(int(s.id), int(s.night)); pl.active[s.id] && !down && len(open) > 0 {
			s.span, s.ready, s.used, s.has, s.block, s.slot = 0, open[0].From, 0, false, -1, -1
			pl.takeList(s)
			return
		}
		pl.takeList(s)
		pl.drop(s)
	}
}

// settle finds the next instant at which a telescope may act: free, in open
// time, under an open sky.
func (pl *Player) settle(s *scope) {
	p := pl.st.p
	for int(s.night) < p.Nights {
		open := p.Open(int(s.id), int(s.night))
		for s.span < len(open) && s.ready >= open[s.span].To {
			s.span++
		}
		if s.span == len(open) {
			pl.nextNight(s)
			continue
		}
		s.ready = max(s.ready, open[s.span].From)
		if h := hourOf(s.ready); !pl.sky.Open(int(s.site), h) {
			s.ready = (h + 1) * blockTime * model.Micro
			continue
		}
		s.at = s.ready
		return
	}
}

func hourOf(us int64) int64 {
	const h = blockTime * model.Micro
	if us < 0 {
		return (us - h + 1) / h
	}
	return us / h
}

// evening begins a night label: what shares ask for, what finishing a field is
// worth, prices anew where the policy has them, and what a visit left for
// later nights is worth.
func (pl *Player) evening(label int32, at int64) {
	p := pl.st.p
	pl.label = label
	pl.press()
	if pl.policy == Densest || pl.policy == AsPlanned {
		return
	}
	n := int(label)
	if pl.policy == Resolved {
		for f := range pl.field {
			b := p.Bonus(f)
			if b == 0 || pl.field[f] == 0 {
				continue
			}
			for w := p.FieldWant[f]; w < p.FieldWant[f+1]; w++ {
				pl.f.boost[w] = b / float64(pl.field[f])
			}
		}
		pl.f.know(hourOf(at), func(site int) bool { return pl.sky.Open(site, hourOf(at)) })
		pl.f.again(n)
		pl.f.choose(min(n+1, p.Nights), false)
		return
	}
	pl.f.renew(min(n+1, p.Nights), func(w int) bool { return pl.nightOf[w] >= label-1 })
}

// press makes the programs that are over their share worth less, and those
// under it more.
func (pl *Player) press() {
	all := 0.0
	for _, x := range pl.programs {
		all += x
	}
	if all == 0 {
		return
	}
	for i := range pl.programs {
		pr := &pl.st.Survey.Programs[i]
		switch share := pl.programs[i] / all; {
		case share > pr.ShareMax:
			pl.pressure[i] *= 0.8
		case share < pr.ShareMin:
			pl.pressure[i] *= 1.25
		default:
			pl.pressure[i] += 0.1 * (1 - pl.pressure[i])
		}
	}
}

// hours sums up the telescopes' open time and what a closed sky took of it.
func (pl *Player) hours() {
	p := pl.st.p
	for t := range p.Scopes {
		if !pl.active[t] {
			continue
		}
		for n := range p.Nights {
			for _, o := range p.Open(t, n) {
				for at := o.From; at < o.To; {
					end := min(o.To, (hourOf(at)+1)*blockTime*model.Micro)
					h := model.Sec(end-at) / 3600
					pl.out.Open += h
					if !pl.sky.Open(int(p.Scopes[t].Site), hourOf(at)) {
						pl.out.Lost += h
					}
					at = end
				}
			}
		}
	}
}
