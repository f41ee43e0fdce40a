package search

import (
	"math"

	"nightwright/constraints/mount"
	"nightwright/constraints/survey"
	"nightwright/scheduler/model"
	"nightwright/visibility"
	"nightwright/visibility/ephemeris"
)

// unit of the integer scores: 1e-12 of coverage.
const scoreUnit = 1e12

// entry is one exposure in a telescope-night.
type entry struct {
	start, length int64   // us
	early, late   int64   // the start may be shifted inside [early, late] alone
	credit        int64   // 1e-12 of C
	slope         float64 // d credit / d start, per us
	visit         int32
	want          int32
	step          int16
	filter        int16
	east          bool
	at, to        mount.Pointing // at its start and its end
	known         knownGap
}

// knownGap is the gap before an entry as last worked out, and what it hangs on.
type knownGap struct {
	gap         int64
	before      int32 // want of the one before
	step        int16
	start, then int64 // own start, and that of the one before
}

// gapBefore returns the needed gap between two neighbours, from memory while
// neither has moved.
func (s *state) gapBefore(scope int32, prev, e *entry) int64 {
	k := &e.known
	if k.gap == 0 || k.before != prev.want || k.step != prev.step || k.start != e.start || k.then != prev.start {
		*k = knownGap{s.gapBetween(scope, prev, e), prev.want, prev.step, e.start, prev.start}
	}
	return k.gap
}

func (e *entry) end() int64 { return e.start + e.length }

// night is one telescope-night: its exposures in order of time, and what is
// needed to judge a change of it quickly.
type night struct {
	list []entry
	gap  []int64 // gap[i]: needed between list[i-1] and list[i], us; gap[0] = 0
	// first[i], last[i]: the earliest and latest start of i when everything
	// on that side is pushed as far as its shift window and the gaps allow
	// (Savelsbergh 1992).
	first, last []int64
	// Running sums over entries, for the cost of a push: idle time after
	// each entry, slope, and slope times idle (see push.go).
	idle   []float64
	slope  []float64
	moment []float64
	used   int64   // exposures and needed gaps, us
	priced float64 // price of the used time, C
}

// visit is one visit (one exposure or a whole set) of a want.
type visit struct {
	want   int32
	scope  int32
	night  int32
	alive  bool
	fixed  bool  // held or done: never moved
	born   int32 // place in the journal's born, or -1 when older than the transaction
	start  int64 // of its first exposure
	early  int64 // the first exposure's shift window
	late   int64
	credit int64 // of all its exposures
	charge int64 // what it costs to take it out: a planner's calendar shifts
	ref    int32 // which visit of an earlier plan it is, from 1; 0: a new one
}

// state is the search's own picture of a plan. Only one goroutine changes it.
type state struct {
	p        *model.Problem
	price    pricer
	theta    float64   // weight of the price of time in a move's worth
	hope     float64   // part of its want's mu that a visit made to leave is believed to get elsewhere
	mu       []float64 // [want] the placer's
	nights   []night   // [scope * p.Nights + night]
	visits   []visit
	free     []int32   // dead visits to be used again
	of       [][]int32 // [want] its visits, unordered
	score    int64     // sum of credits and bonuses
	got      []int32   // [field] visits got, for the bonus
	bonus    []int64   // [field] bonus when every visit is got, 1e-12 of C
	wanted   []int32   // [field]
	stats    Stats
	charged  int64 // charges of the visits of an earlier plan that are out
	undo     journal
	spare    []entry   // the marked night's list
	timeThen []int64   // time when it was marked
	rates    []float64 // [program] worth of a second of exposure beside its credit, C: shares
	time     []int64   // [program] exposure time in the plan, us
	// Least and greatest price in each telescope-night's open time, C per second.
	least, dearest []float64
	priced         float64 // sum of the nights' priced time, C
}

// pricer gives the price of time; the dual's prices do.
type pricer interface {
	At(scope int, us int64) float64 // C per second
	Range() (least, most []float64) // of each telescope-night's open time
}

func newState(p *model.Problem, price pricer) *state {
	s := &state{p: p, price: price}
	s.least, s.dearest = price.Range()
	s.nights = make([]night, len(p.Scopes)*p.Nights)
	s.of = make([][]int32, len(p.Wants))
	s.rates, s.time = make([]float64, len(p.Survey.Programs)), make([]int64, len(p.Survey.Programs))
	for i, sec := range p.GivenSeconds {
		s.time[i] = model.MicroOf(sec)
	}
	n := len(p.Survey.Fields)
	s.got, s.wanted, s.bonus = make([]int32, n), make([]int32, n), make([]int64, n)
	for f := range n {
		s.wanted[f] = p.Remaining(f)
		s.bonus[f] = int64(math.Round(scoreUnit * p.Bonus(f)))
	}
	return s
}

// sight computes where a telescope points at a field at an instant.
func (s *state) sight(scope int32, fr *visibility.Frame, c ephemeris.Vec) mount.Pointing {
	if s.p.Scopes[scope].Mount == survey.Equatorial {
		return mount.Pointing{HourAngle: fr.HourAngle(c), Declination: fr.Declination(c)}
	}
	alt, az := fr.AltAz(c)
	return mount.Pointing{Altitude: alt, Azimuth: az}
}

// gapGuard is added to every computed gap, us, for rounding; axisGuard, rad, is
// how far an axis' end may be from where the audit has it, on the sky: it works
// gaps out from the exact path, and directions differ by up to 0.05".
const (
	gapGuard  = 1000
	axisGuard = 2.5e-7
	sideGuard = 2e-6 // rad of hour angle
)

// gapBetween returns the needed gap from a to b, us, on a telescope.
func (s *state) gapBetween(scope int32, a, b *entry) int64 {
	t := s.p.Scopes[scope].Telescope
	toEast := b.east
	if t.Flip != nil && (math.Abs(a.at.HourAngle) < sideGuard || math.Abs(b.at.HourAngle) < sideGuard) {
		toEast = !a.east // too near the meridian to be sure of the side
	}
	gap := mount.Gap(t, a.to, b.at, int(a.filter), int(b.filter), a.east, toEast)
	return model.MicroCeil(gap+slewGuard(t, &a.to, &b.at)) + gapGuard
}

// slewGuard is how much longer the audit may find a slew, s: near the zenith
// (of an equatorial mount: the pole) an axis has far to go for an arc second.
func slewGuard(t *survey.Telescope, a, b *mount.Pointing) float64 {
	if t.Mount == survey.Altazimuth && a.Altitude < steep && b.Altitude < steep {
		// The time is concave in the way: no more than that for the guard alone.
		return mount.AxisTime(5*axisGuard, t.Slew.Rate, t.Slew.Acceleration)
	}
	turn, ca, cb := b.Azimuth-a.Azimuth, math.Cos(a.Altitude), math.Cos(b.Altitude)
	if t.Mount == survey.Equatorial {
		turn, ca, cb = b.HourAngle-a.HourAngle, math.Cos(a.Declination), math.Cos(b.Declination)
	}
	turn = math.Abs(math.Remainder(turn, 2*math.Pi))
	more := turn + axisGuard*(1/math.Max(ca, 1e-6)+1/math.Max(cb, 1e-6))
	return mount.AxisTime(more, t.Slew.Rate, t.Slew.Acceleration) - mount.AxisTime(turn, t.Slew.Rate, t.Slew.Acceleration)
}

// set puts an entry at a start: pointing, quality, credit and slope from the
// fast sky at the true times. It reports false when the quality there is
// below the demand's least.
func (s *state) set(scope int32, e *entry, start int64) bool {
	w := &s.p.Wants[e.want]
	e.start = start
	site := int(s.p.Scopes[scope].Site)
	t0, t1 := model.Sec(start), model.Sec(start+e.length)
	mid := (t0 + t1) / 2
	c := s.p.Sky.Direction(int(w.Field), mid)
	a := s.p.Sky.Horizon(site, t0)
	e.at = s.sight(scope, &a, c)
	b := s.p.Sky.Horizon(site, t1)
	e.to = s.sight(scope, &b, c)
	e.east = a.HourAngle(c) < 0
	fr := s.p.Sky.Frame(site, mid)
	filter := int(e.filter)
	q := s.p.Sky.Quality(&fr, filter, c)
	e.credit = s.credit(w, q)
	const d = 90.0 // s, for the slope
	fr = s.p.Sky.Frame(site, mid+d)
	e.slope = float64(s.credit(w, s.p.Sky.Quality(&fr, filter, c))-e.credit) / (d * model.Micro)
	return q >= w.MinQuality+qualityGuard
}

// qualityGuard keeps plans off the edge of min_quality by more than the fast
// sky's error.
const qualityGuard = 1e-5

// credit is what an exposure of quality q adds to C, in score units.
func (s *state) credit(w *model.Want, q float64) int64 {
	return int64(math.Round(w.Value * q / float64(len(w.Steps)) * scoreUnit))
}

// refresh recomputes everything of a night that follows from its list.
func (s *state) refresh(scope int32, n *night) {
	m := len(n.list)
	n.gap = grow(n.gap, m)
	n.first, n.last = grow(n.first, m), grow(n.last, m)
	n.idle, n.slope, n.moment = grow(n.idle, m+1), grow(n.slope, m+1), grow(n.moment, m+1)
	s.priced -= n.priced
	n.used, n.priced = 0, 0
	for i := range n.list {
		e := &n.list[i]
		if i == 0 {
			n.gap[0] = 0
			n.first[0] = e.early
		} else {
			n.gap[i] = s.gapBefore(scope, &n.list[i-1], e)
			n.first[i] = max(e.early, n.first[i-1]+n.list[i-1].length+n.gap[i])
		}
		n.used += e.length + n.gap[i]
		n.priced += s.price.At(int(scope), e.start) * model.Sec(e.length+n.gap[i])
	}
	for i := m - 1; i >= 0; i-- {
		e := &n.list[i]
		n.last[i] = e.late
		if i < m-1 {
			n.last[i] = min(e.late, n.last[i+1]-n.gap[i+1]-e.length)
		}
	}
	s.priced += n.priced
	n.idle[0], n.slope[0], n.moment[0] = 0, 0, 0
	for i := range n.list {
		e := &n.list[i]
		free := 0.0
		if i < m-1 {
			free = float64(n.list[i+1].start - e.end() - n.gap[i+1])
		}
		n.slope[i+1] = n.slope[i] + e.slope
		n.moment[i+1] = n.moment[i] + e.slope*n.idle[i]
		n.idle[i+1] = n.idle[i] + free
	}
}

// grow returns a slice of length n, keeping the memory.
func grow[T any](x []T, n int) []T {
	if cap(x) < n {
		return make([]T, n, n+n/4+8)
	}
	return x[:n]
}
