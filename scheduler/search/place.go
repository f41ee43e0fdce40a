package search

import (
	"math"
	"sort"

	"nightwright/constraints/mount"
	"nightwright/scheduler/model"
	"nightwright/visibility"
	"nightwright/visibility/ephemeris"
)

// spot is a place where a step could go: the best of a start bin on one
// telescope.
type spot struct {
	start  int64
	profit float64 // C
	scope  int32
	night  int32
	eject  ejected // visits that make room
	combo  int32   // of sets: the steps' spots
	after  int32   // visit whose exposure comes before, or -1
	step   int16   // that exposure's step
}

// ejected is up to three visits that make room; -1 where there is none.
type ejected [3]int32

var nobody = ejected{-1, -1, -1}

// holds reports whether a visit is among them.
func (e ejected) holds(id int32) bool { return e[0] == id || e[1] == id || e[2] == id }

// finder lists the spots of one step of a want: one state read, nothing
// changed. Each worker has its own.
type finder struct {
	s      *state
	bin    int64   // width of the start bins, us
	row    []uint8 // quality along the night, from the shelf
	first  int64   // instant of row[0], us
	poses  []mount.Pointing
	known  []bool
	spots  []spot
	value  float64 // of a step at quality 1
	extra  float64 // of its exposure time, for the shares
	most   float64 // worth of the best moment of the night
	dear   float64 // the night's greatest price, C per second, times theta
	least  float64 // C: spots not above are of no use
	w      *model.Want
	step   int
	scope  int32
	night  int32
	n      *night
	g      *visibility.FrameGrid
	c      ephemeris.Vec
	length int64
	lg     int64
	probe  entry
	budget int64
	deep   int     // most entries that may make room together: 1, or up to 3
	noise  float64 // part of a worth that chance adds or takes
	salt   uint64  // what chance hangs on
	only   Range   // when not zero, starts are looked for inside it alone
	worthy []Range // stretches of starts that can pay
}

// Range is a stretch of starts [From, To], us.
type Range struct{ From, To int64 }

// ease is kept between an estimated start and the limits of its position, us:
// gaps are estimated from frames, and change a little as neighbours are pushed.
const ease = 2 * model.Micro

// shelfUS is the shelf's step, us.
const shelfUS = model.ShelfStep * model.Micro

// find appends to f.spots the best spot of each bin of one telescope-night
// for a step of a want, in order of time, as far as it is worth more than
// least. It returns the index of the first spot appended.
func (f *finder) find(w *model.Want, step int, scope int32, nightIndex int, least float64) int {
	from := len(f.spots)
	s := f.s
	open := s.p.Open(int(scope), nightIndex)
	windows := s.p.Windows.Of(int(w.Unit), int(s.p.Scopes[scope].Class), nightIndex)
	if len(open) == 0 || len(windows) == 0 {
		return from
	}
	f.w, f.step, f.scope, f.night, f.least = w, step, scope, int32(nightIndex), least
	f.value = w.Value / float64(len(w.Steps))
	f.bin = startBin * model.Micro
	if len(w.Steps) == 1 && w.Spacing >= 12*3600*model.Micro {
		f.bin = wideBin * model.Micro
	}
	st := &w.Steps[step]
	class := s.p.Scopes[scope].Class
	f.length = s.p.Length(st, scope)
	f.extra = s.rates[w.Program] * model.Sec(f.length)
	if s.p.Barred(w, scope, nightIndex) {
		return from
	}
	limit := f.value*s.p.Shelf.Top(class, nightIndex, st.Row) + f.extra
	if s.theta > 0 {
		limit -= s.theta * s.least[int(scope)*s.p.Nights+nightIndex] * model.Sec(f.length)
	}
	if limit <= least {
		return from
	}
	f.most = f.value*s.p.Shelf.Top(class, nightIndex, st.Row) + f.extra
	f.dear = s.theta * s.dearest[int(scope)*s.p.Nights+nightIndex]
	var first int32
	first, f.row = s.p.Shelf.Row(class, nightIndex, st.Row)
	f.first = int64(first) * shelfUS
	f.n = &s.nights[int(scope)*s.p.Nights+nightIndex]
	f.g = s.p.Grid(int(s.p.Scopes[scope].Site), nightIndex)
	f.c = s.p.Sky.Direction(int(w.Field), f.g.From+f.g.Step*float64(len(f.g.Frames)/2))
	f.lg = s.p.Scopes[scope].LeastGap
	f.budget = math.MaxInt64
	if s.p.Scopes[scope].KeepFree > 0 {
		f.budget = s.p.Budget(int(scope), nightIndex) - f.n.used
	}
	f.probe = entry{length: f.length, filter: int16(st.Filter)}
	f.known = grow(f.known, len(f.g.Frames))
	clear(f.known)
	f.poses = grow(f.poses, len(f.g.Frames))
	f.screen()
	for _, win := range windows {
		wf, wt := s.p.Inward(win)
		for _, o := range open {
			lo, hi := max(wf, o.From), min(wt, o.To)-f.length-ease
			for _, r := range f.worthy {
				if a, b := max(lo, r.From), min(hi, r.To); b >= a {
					f.stretch(a, b)
				}
			}
		}
	}
	return from
}

// know computes the pointing at a frame once.
func (f *finder) know(k int) {
	if !f.known[k] {
		f.known[k] = true
		f.poses[k] = f.s.sight(f.scope, &f.g.Frames[k], f.c)
	}
}

// quality estimates q of an exposure that starts at s, from the shelf.
func (f *finder) quality(s int64) float64 {
	x := s + f.length/2 - f.first
	if x < 0 {
		x = 0
	}
	k := int(x / shelfUS)
	if k >= len(f.row)-1 {
		return float64(f.row[len(f.row)-1]) / 255
	}
	u := float64(x-int64(k)*shelfUS) / shelfUS
	return (float64(f.row[k]) + u*(float64(f.row[k+1])-float64(f.row[k]))) / 255
}

// steep is the altitude above which azimuth turns too fast for a line between
// frames, rad.
const steep = 65 * math.Pi / 180

// aim estimates the pointing at an instant, from the frames.
func (f *finder) aim(us int64) mount.Pointing {
	x := (model.Sec(us) - f.g.From) / f.g.Step
	k := min(max(int(x), 0), len(f.g.Frames)-2)
	f.know(k)
	f.know(k + 1)
	u := x - float64(k)
	a, b := &f.poses[k], &f.poses[k+1]
	if a.Altitude > steep || b.Altitude > steep {
		fr := f.s.p.Sky.Horizon(int(f.s.p.Scopes[f.scope].Site), model.Sec(us))
		return f.s.sight(f.scope, &fr, f.c)
	}
	az := math.Remainder(b.Azimuth-a.Azimuth, 2*math.Pi)
	ha := math.Remainder(b.HourAngle-a.HourAngle, 2*math.Pi)
	return mount.Pointing{
		Altitude:    a.Altitude + u*(b.Altitude-a.Altitude),
		Azimuth:     a.Azimuth + u*az,
		HourAngle:   math.Remainder(a.HourAngle+u*ha, 2*math.Pi),
		Declination: a.Declination,
	}
}

// stretch tries every position whose start can fall in [lo, hi].
func (f *finder) stretch(lo, hi int64) {
	list := f.n.list
	m := len(list)
	// The first position p (before list[p]) that can matter.
	p := sort.Search(m, func(i int) bool { return list[i].start >= lo })
	for p > 0 && f.n.first[p-1]+list[p-1].length > lo-30*60*model.Micro && list[p-1].end() > lo {
		p--
	}
	for ; p <= m; p++ {
		if p > 0 && f.n.first[p-1]+list[p-1].length+f.lg > hi {
			break
		}
		f.position(p, p, lo, hi) // free insertion
		// The least a neighbour would cost, against the most the spot can earn.
		if p < m && f.most+f.dear*model.Sec(list[p].length+f.n.gap[p])-f.s.parting(&f.s.visits[list[p].visit]) <= f.least && f.deep <= 1 {
			continue
		}
		for next := p + 1; next <= min(m, p+max(1, f.deep)); next++ {
			f.position(p, next, lo, hi) // list[p:next] makes room
		}
	}
}

// position tries to go between list[p-1] and list[next]; when next > p the
// entries between leave with their visits.
func (f *finder) position(p, next int, lo, hi int64) {
	n := f.n
	list := n.list
	m := len(list)
	free, need := int64(0), f.length
	lost := 0.0
	eject := nobody
	// Where the start can be, with least gaps.
	from, to := lo, hi
	if p > 0 {
		from = max(from, n.first[p-1]+list[p-1].length+f.lg)
	}
	if next < m {
		to = min(to, n.last[next]-f.lg-f.length)
	}
	if to < from {
		return
	}
	for k := p; k < next; k++ {
		e := &list[k]
		v := &f.s.visits[e.visit]
		if v.fixed {
			return
		}
		free += e.length + n.gap[k]
		if eject.holds(e.visit) {
			continue // another exposure of the same set
		}
		eject[k-p] = e.visit
		lost += float64(v.credit+v.charge) / scoreUnit
		w := &f.s.p.Wants[e.want]
		if r := f.s.rates[w.Program]; r != 0 {
			lost += r * f.s.visitSeconds(v)
		}
		if f.s.got[w.Field] == f.s.wanted[w.Field] {
			lost += float64(f.s.bonus[w.Field]) / scoreUnit
		}
	}
	// A bound before anything is computed in earnest.
	seed := from
	if p > 0 {
		seed = min(max(seed, list[p-1].end()), to)
	} else if next < m {
		seed = max(seed, to-3600*model.Micro)
	}
	q := f.quality(seed)
	if f.beaten(seed, to-from, f.value*q, lost, need-free) {
		return
	}
	if next > p {
		rate := f.s.theta * f.s.price.At(int(f.scope), seed)
		if f.value*q*1.02+f.extra-lost-rate*model.Sec(need+f.lg-free) <= f.least {
			return
		}
	} else if p > 0 && next < m {
		// Between neighbours: quality hardly changes inside the gap.
		if span := list[next].start - list[p-1].end(); span < f.bin && f.value*q*1.02+f.extra <= f.least {
			return
		}
		if n.last[next]-n.first[p-1]-list[p-1].length < f.length+2*f.lg {
			return
		}
	}
	f.weigh(p, next, from, to, seed, free, lost, eject)
}

// visitSeconds returns a visit's exposure time.
func (s *state) visitSeconds(v *visit) float64 {
	w := &s.p.Wants[v.want]
	var t float64
	for i := range w.Steps {
		t += model.Sec(s.p.Length(&w.Steps[i], v.scope))
	}
	return t
}

// weigh works out gaps and pushes and notes the worth of the position.
func (f *finder) weigh(p, next int, from, to, seed, free int64, lost float64, eject ejected) {
	n := f.n
	list := n.list
	m := len(list)
	f.probe.at = f.aim(seed)
	f.probe.to = f.aim(seed + f.length)
	f.probe.east = f.probe.at.HourAngle < 0
	used := f.length - free
	var before, after int64
	left, right := int64(math.MinInt64/4), int64(math.MaxInt64/4)
	if p > 0 {
		before = f.s.gapBetween(f.scope, &list[p-1], &f.probe)
		from = max(from, n.first[p-1]+list[p-1].length+before+ease)
		left = list[p-1].end() + before
		used += before
	}
	if next < m {
		after = f.s.gapBetween(f.scope, &f.probe, &list[next])
		to = min(to, n.last[next]-after-f.length-ease)
		right = list[next].start - after - f.length
		used += after - n.gap[next]
	}
	if to < from || used > f.budget {
		return
	}
	if right >= left {
		// Room without a push: the best of each bin.
		a, b := max(left, from), min(right, to)
		if a > b {
			// Only with a push after all: the shift windows are narrow.
			s := min(max(a, from), to)
			f.note(s, p, next, left, right, used, lost, eject)
			return
		}
		f.note(a, p, next, left, right, used, lost, eject)
		if b-a > f.bin {
			for s := (a/f.bin + 1) * f.bin; s < b; s += f.bin {
				f.note(s, p, next, left, right, used, lost, eject)
			}
		}
		if b > a {
			f.note(b, p, next, left, right, used, lost, eject)
		}
		return
	}
	// Everything to the right moves, everything to the left, or half each.
	f.note(min(max(left, from), to), p, next, left, right, used, lost, eject)
	f.note(min(max(right, from), to), p, next, left, right, used, lost, eject)
}

// note keeps the start if it is the best of its bin.
func (f *finder) note(s int64, p, next int, left, right, used int64, lost float64, eject ejected) {
	q := f.quality(s)
	if q < f.w.MinQuality {
		return
	}
	profit := f.value*q + f.extra - lost - f.s.theta*f.s.price.At(int(f.scope), s)*model.Sec(used)
	if profit <= f.least {
		return
	}
	if s < left {
		profit += f.n.pushLeft(p-1, left-s) / scoreUnit
	}
	if s > right {
		profit += f.n.pushRight(next, s-right) / scoreUnit
	}
	if f.noise > 0 {
		profit += f.value * q * f.noise * f.chance(s)
	}
	if profit <= f.least {
		return
	}
	after, step := int32(-1), int16(0)
	if p > 0 {
		after, step = f.n.list[p-1].visit, f.n.list[p-1].step
	}
	if k := len(f.spots) - 1; k >= 0 {
		last := &f.spots[k]
		if last.scope == f.scope && last.night == f.night && last.start/f.bin == s/f.bin {
			if profit > last.profit {
				*last = spot{start: s, profit: profit, scope: f.scope, night: f.night, eject: eject, after: after, step: step}
			}
			return
		}
	}
	f.spots = append(f.spots, spot{start: s, profit: profit, scope: f.scope, night: f.night, eject: eject, after: after, step: step})
}

// chance returns a number in [-1, 1) that hangs on the salt, the want and the
// start alone, so that it is the same whoever looks.
func (f *finder) chance(s int64) float64 {
	x := f.salt ^ uint64(s)*0x9e3779b97f4a7c15 ^ uint64(f.w.Field)<<32 ^ uint64(f.scope)<<56
	x ^= x >> 30
	x *= 0xbf58476d1ce4e5b9
	x ^= x >> 27
	x *= 0x94d049bb133111eb
	x ^= x >> 31
	return float64(x>>11)/(1<<52) - 1
}
