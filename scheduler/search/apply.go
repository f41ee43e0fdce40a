package search

import (
	"sort"

	"nightwright/scheduler/model"
)

// journal remembers what a transaction changed, so that it can be taken back.
type journal struct {
	active bool
	nights []savedNight
	marked map[int]bool
	died   []int32 // visits that left
	born   []int32 // visits that came
	score  int64
	time   []int64
}

type savedNight struct {
	index int
	list  []entry
}

// begin starts a transaction.
func (s *state) begin() {
	s.undo.active = true
	s.undo.nights = s.undo.nights[:0]
	if s.undo.marked == nil {
		s.undo.marked = map[int]bool{}
	}
	clear(s.undo.marked)
	s.undo.died, s.undo.born = s.undo.died[:0], s.undo.born[:0]
	s.undo.score = s.score
	s.undo.time = append(s.undo.time[:0], s.time...)
}

// save keeps a night's list before its first change in the transaction.
func (s *state) save(index int) {
	if !s.undo.active || s.undo.marked[index] {
		return
	}
	s.undo.marked[index] = true
	k := len(s.undo.nights)
	if cap(s.undo.nights) > k {
		s.undo.nights = s.undo.nights[:k+1]
	} else {
		s.undo.nights = append(s.undo.nights, savedNight{})
	}
	sn := &s.undo.nights[k]
	sn.index = index
	sn.list = append(sn.list[:0], s.nights[index].list...)
}

// commit keeps the transaction's changes.
func (s *state) commit() {
	s.undo.active = false
	for _, v := range s.undo.born {
		s.visits[v].born = -1
	}
	s.free = append(s.free, s.undo.died...)
}

// rollback takes the transaction's changes back.
func (s *state) rollback() {
	for _, v := range s.undo.born {
		if s.visits[v].alive {
			s.forget(v)
		}
	}
	for _, v := range s.undo.died {
		if s.visits[v].born < 0 {
			s.remember(v)
		}
	}
	for i := range s.undo.nights {
		sn := &s.undo.nights[i]
		n := &s.nights[sn.index]
		n.list = append(n.list[:0], sn.list...)
		s.refresh(int32(sn.index/s.p.Nights), n)
		s.sync(n)
	}
	// A visit that was shifted and then ejected has its old credit again.
	s.undo.active = false
	s.free = append(s.free, s.undo.born...)
	s.score = s.undo.score
	copy(s.time, s.undo.time)
}

// sync copies starts and credits of a night's entries into the visits.
func (s *state) sync(n *night) {
	for i := range n.list {
		e := &n.list[i]
		v := &s.visits[e.visit]
		if e.step == 0 {
			v.start, v.early, v.late = e.start, e.early, e.late
			v.credit = 0
		}
	}
	for i := range n.list {
		s.visits[n.list[i].visit].credit += n.list[i].credit
	}
}

// forget takes a visit off its want's list and out of the bonus; its entries
// are the caller's business.
func (s *state) forget(id int32) {
	v := &s.visits[id]
	v.alive = false
	s.charged += v.charge
	list := s.of[v.want]
	for i, x := range list {
		if x == id {
			list[i] = list[len(list)-1]
			s.of[v.want] = list[:len(list)-1]
			break
		}
	}
	f := s.p.Wants[v.want].Field
	if s.got[f] == s.wanted[f] {
		s.score -= s.bonus[f]
	}
	s.got[f]--
}

// remember is the inverse of forget.
func (s *state) remember(id int32) {
	v := &s.visits[id]
	v.alive = true
	s.charged -= v.charge
	s.of[v.want] = append(s.of[v.want], id)
	f := s.p.Wants[v.want].Field
	s.got[f]++
	if s.got[f] == s.wanted[f] {
		s.score += s.bonus[f]
	}
}

// remove takes a visit out of the plan.
func (s *state) remove(id int32) {
	v := &s.visits[id]
	index := int(v.scope)*s.p.Nights + int(v.night)
	s.save(index)
	n := &s.nights[index]
	out := n.list[:0]
	for i := range n.list {
		if n.list[i].visit == id {
			s.score -= n.list[i].credit
			s.time[s.p.Wants[v.want].Program] -= n.list[i].length
			continue
		}
		out = append(out, n.list[i])
	}
	n.list = out
	s.refresh(v.scope, n)
	s.forget(id)
	s.undo.died = append(s.undo.died, id)
}

// newVisit registers a visit without entries yet.
func (s *state) newVisit(want, scope, nightIndex int32) int32 {
	var id int32
	if k := len(s.free); k > 0 {
		id = s.free[k-1]
		s.free = s.free[:k-1]
	} else {
		id = int32(len(s.visits))
		s.visits = append(s.visits, visit{})
	}
	s.visits[id] = visit{want: want, scope: scope, night: nightIndex, born: int32(len(s.undo.born))}
	s.remember(id)
	s.undo.born = append(s.undo.born, id)
	return id
}

// insert puts one step of a visit at a spot, inside [early, late], pushing its
// neighbours as far as needed. It reports false, leaving the night
// half changed for rollback to repair, when that can't be done.
func (s *state) insert(id int32, step int, sp spot, early, late int64) bool {
	target := min(max(sp.start, early), late)
	v := &s.visits[id]
	w := &s.p.Wants[v.want]
	index := int(v.scope)*s.p.Nights + int(v.night)
	s.save(index)
	n := &s.nights[index]
	e := entry{
		length: s.p.Length(&w.Steps[step], v.scope), visit: id, want: v.want,
		step: int16(step), filter: int16(w.Steps[step].Filter), early: early, late: late,
	}
	if !s.set(v.scope, &e, target) {
		return false
	}
	s.keepQuality(v.scope, &e)
	i := n.behind(sp.after, sp.step, target)
	n.list = append(n.list, entry{})
	copy(n.list[i+1:], n.list[i:])
	n.list[i] = e
	s.score += e.credit
	s.time[w.Program] += e.length
	ok := s.settle(v.scope, n, i)
	s.refresh(v.scope, n)
	if !ok || s.overBudget(v.scope, v.night, n) {
		return false
	}
	s.sync(n)
	return true
}

// keepQuality draws the shift window of an entry in until the quality at both
// its ends is above the demand's least.
func (s *state) keepQuality(scope int32, e *entry) {
	w := &s.p.Wants[e.want]
	if w.MinQuality == 0 {
		return
	}
	for _, side := range []*int64{&e.early, &e.late} {
		for try := 0; *side != e.start; try++ {
			if s.p.Quality(w, int(e.step), scope, *side+e.length/2) >= w.MinQuality*1.05+qualityGuard {
				break
			}
			*side = e.start + (*side-e.start)/2
			if try == 4 {
				*side = e.start
			}
		}
	}
}

// behind returns the index after a given exposure, or by time when that is
// not there any more.
func (n *night) behind(visit int32, step int16, target int64) int {
	if visit < 0 {
		return 0
	}
	for i := range n.list {
		if n.list[i].visit == visit && n.list[i].step == step {
			return i + 1
		}
	}
	return sort.Search(len(n.list), func(k int) bool { return n.list[k].start > target })
}

func (s *state) overBudget(scope, nightIndex int32, n *night) bool {
	return s.p.Scopes[scope].KeepFree > 0 && n.used > s.p.Budget(int(scope), int(nightIndex))
}

// settle makes room around list[i]: what is before it moves earlier, what is
// after it moves later, until every gap holds.
func (s *state) settle(scope int32, n *night, i int) bool {
	// How far each side could give way.
	lo, hi := i, i
	for k := i - 1; k >= 0; k-- {
		e, next := &n.list[k], &n.list[k+1]
		gap := s.gapBetween(scope, e, next)
		if e.end()+gap <= next.start {
			break
		}
		start := next.start - gap - e.length
		if start < e.early {
			// Its window ends here: stay there, and let the forward pass
			// carry the rest to the right.
			start = e.early
		}
		if !s.shift(scope, e, start) {
			return false
		}
		lo = k
		if start == e.early {
			// What is before may still have to give way to this one.
			continue
		}
	}
	for k := max(lo, 1); k < len(n.list); k++ {
		e, prev := &n.list[k], &n.list[k-1]
		need := prev.end() + s.gapBetween(scope, prev, e)
		for try := 0; e.start < need; try++ {
			if need > e.late || try == 8 {
				return false
			}
			if !s.shift(scope, e, need) {
				return false
			}
			need = prev.end() + s.gapBetween(scope, prev, e)
		}
		if k > hi && k > i && e.start >= need && k+1 < len(n.list) {
			next := &n.list[k+1]
			if e.end()+s.gapBetween(scope, e, next) <= next.start {
				// Nothing further to the right is touched.
				return true
			}
		}
	}
	return true
}

// shift moves an entry to another start and keeps the score.
func (s *state) shift(scope int32, e *entry, start int64) bool {
	if start == e.start {
		return true
	}
	if s.visits[e.visit].fixed {
		return false
	}
	old := e.credit
	if !s.set(scope, e, start) {
		return false
	}
	s.score += e.credit - old
	return true
}

// maxShift is the furthest a visit may be pushed from where it was placed, us.
const maxShift = 20 * 60 * model.Micro

// mark is a point inside a transaction to which one telescope-night can be
// taken back.
type mark struct {
	index      int
	died, born int
	score      int64
	time       []int64
}

// mark remembers one telescope-night, all that a single insertion touches.
func (s *state) mark(scope, nightIndex int32) mark {
	m := mark{int(scope)*s.p.Nights + int(nightIndex), len(s.undo.died), len(s.undo.born), s.score, s.timeThen}
	s.timeThen = append(s.timeThen[:0], s.time...)
	m.time = s.timeThen
	s.spare = append(s.spare[:0], s.nights[m.index].list...)
	return m
}

// undoTo takes back what happened to the marked night since.
func (s *state) undoTo(m mark) {
	for _, v := range s.undo.born[m.born:] {
		if s.visits[v].alive {
			s.forget(v)
		}
		s.free = append(s.free, v)
	}
	s.undo.born = s.undo.born[:m.born]
	for _, v := range s.undo.died[m.died:] {
		if s.visits[v].born < int32(m.born) {
			s.remember(v)
		}
	}
	s.undo.died = s.undo.died[:m.died]
	n := &s.nights[m.index]
	n.list = append(n.list[:0], s.spare...)
	s.refresh(int32(m.index/s.p.Nights), n)
	s.sync(n)
	s.score = m.score
	copy(s.time, m.time)
}
