package search

import (
	"context"
	"math"
	"slices"
)

// snapshot is a copy of everything in a state that changes.
type snapshot struct {
	lists  [][]entry
	visits []visit
	free   []int32
	of     [][]int32
	got    []int32
	time   []int64
	score  int64
}

func (s *state) snapshot() *snapshot {
	c := &snapshot{
		lists: make([][]entry, len(s.nights)), visits: slices.Clone(s.visits), free: slices.Clone(s.free),
		of: make([][]int32, len(s.of)), got: slices.Clone(s.got), time: slices.Clone(s.time), score: s.score,
	}
	for i := range s.nights {
		c.lists[i] = slices.Clone(s.nights[i].list)
	}
	for i := range s.of {
		c.of[i] = slices.Clone(s.of[i])
	}
	return c
}

func (s *state) restore(c *snapshot) {
	for i := range s.nights {
		n := &s.nights[i]
		n.list = append(n.list[:0], c.lists[i]...)
		s.refresh(int32(i/s.p.Nights), n)
	}
	for i := range s.of {
		s.of[i] = append(s.of[i][:0], c.of[i]...)
	}
	s.visits = append(s.visits[:0], c.visits...)
	s.free = append(s.free[:0], c.free...)
	copy(s.got, c.got)
	copy(s.time, c.time)
	s.score = c.score
}

const (
	iterateNoise = 0.3   // of a worth
	iterateHeat  = 0.004 // of the score: how much worse a step may be taken at first
	iterateDeep  = 3     // visits that may make room together
	iterateFull  = 600   // exposures up to which every step is taken
	iterateMost  = 4000  // exposures: larger plans are swept, not iterated
)

// Iterate betters small plans of few long visits, where sweeps end early: it
// clears a stretch of a night, places the fields it held again with some
// chance in their worths, and keeps what is better, or at first a little worse
// (annealed acceptance). It ends with the best plan met.
func (x *Search) Iterate(ctx context.Context, steps int, report func(done, of int)) {
	s := x.s
	count := 0
	for i := range s.nights {
		count += len(s.nights[i].list)
	}
	if steps == 0 || count == 0 || count > iterateMost {
		return
	}
	// The more exposures a plan has, the dearer a step and the less it can find.
	if count > iterateFull {
		steps = max(1, steps*iterateFull/count)
	}
	s.theta = 0
	clear(x.pl.mu)
	x.pl.deepen(iterateDeep)
	defer x.pl.deepen(1)
	now := s.snapshot()
	best := now
	for k := range steps {
		if ctx.Err() != nil {
			break
		}
		if report != nil && k%16 == 0 {
			report(k, steps)
		}
		fields := x.clearStretch()
		x.pl.shake(iterateNoise, x.rg.Uint64())
		for _, f := range fields {
			x.pl.place(f)
		}
		x.pl.shake(0, 0)
		for _, f := range fields {
			x.pl.place(f)
		}
		heat := iterateHeat * float64(now.score) * math.Pow(0.01, float64(k)/float64(steps))
		switch after := s.score; {
		case after == now.score && k%8 != 0:
			s.restore(now)
		case float64(after) >= float64(now.score)-heat*x.rg.Float64():
			now = s.snapshot()
			if now.score > best.score {
				best = now
			}
		default:
			s.restore(now)
		}
	}
	s.restore(best)
	s.stats.Iterated += int64(steps)
}

// clearStretch takes the visits of part of a random telescope-night out and
// returns their fields and a few others, in random order.
func (x *Search) clearStretch() []int {
	s := x.s
	var fields []int
	add := func(f int) {
		if !slices.Contains(fields, f) {
			fields = append(fields, f)
		}
	}
	n := &s.nights[x.rg.IntN(len(s.nights))]
	s.begin()
	if m := len(n.list); m > 0 {
		from := x.rg.IntN(m)
		to := min(m, from+1+x.rg.IntN(min(m, 12)))
		var ids []int32
		for i := from; i < to; i++ {
			if id := n.list[i].visit; !s.visits[id].fixed && !slices.Contains(ids, id) {
				ids = append(ids, id)
			}
		}
		for _, id := range ids {
			add(int(s.p.Wants[s.visits[id].want].Field))
			s.remove(id)
		}
	}
	s.commit()
	for range 3 {
		add(x.rg.IntN(len(s.got)))
	}
	x.rg.Shuffle(len(fields), func(i, j int) { fields[i], fields[j] = fields[j], fields[i] })
	return fields
}

// deepen sets how many visits may make room together.
func (pl *placer) deepen(most int) {
	pl.find.deep = most
	for i := range pl.scouts {
		pl.scouts[i].find.deep = most
	}
}

// shake sets the chance in the worths of spots.
func (pl *placer) shake(noise float64, salt uint64) {
	pl.find.noise, pl.find.salt = noise, salt
	for i := range pl.scouts {
		pl.scouts[i].find.noise, pl.scouts[i].find.salt = noise, salt
	}
}
