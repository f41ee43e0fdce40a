package search

import (
	"math"
	"math/rand/v2"
	"slices"
	"testing"

	"nightwright/scheduler/model"
	"nightwright/scheduler/trial"
)

// TestPushAgreesWithSimulation pushes random nights to either side and adds
// up, entry by entry, what the closed form says.
func TestPushAgreesWithSimulation(t *testing.T) {
	r := rand.New(rand.NewPCG(1, 1))
	for range 3000 {
		m := 1 + r.IntN(9)
		n := &night{list: make([]entry, m), idle: make([]float64, m+1), slope: make([]float64, m+1), moment: make([]float64, m+1)}
		idle := make([]float64, m) // after each entry
		for i := range m {
			n.list[i].slope = r.NormFloat64()
			if i < m-1 && r.IntN(3) > 0 {
				idle[i] = float64(r.IntN(1000))
			}
			n.slope[i+1] = n.slope[i] + n.list[i].slope
			n.moment[i+1] = n.moment[i] + n.list[i].slope*n.idle[i]
			n.idle[i+1] = n.idle[i] + idle[i]
		}
		i, d := r.IntN(m), int64(r.IntN(2000))
		right, left := 0.0, 0.0
		for k, move := i, float64(d); k < m && move > 0; k++ {
			right += n.list[k].slope * move
			move -= idle[k]
		}
		for k, move := i, float64(d); k >= 0 && move > 0; k-- {
			left -= n.list[k].slope * move
			if k > 0 {
				move -= idle[k-1]
			}
		}
		if got := n.pushRight(i, d); math.Abs(got-right) > 1e-6 {
			t.Fatalf("entry %d of %d to the right by %d: %g, simulated %g", i, m, d, got, right)
		}
		if got := n.pushLeft(i, d); math.Abs(got-left) > 1e-6 {
			t.Fatalf("entry %d of %d to the left by %d: %g, simulated %g", i, m, d, got, left)
		}
	}
}

// brute is the most profit of at most n spots that keep the gap, all tried.
func brute(spots []spot, gap int64, n int) float64 {
	best := 0.0
	for mask := range 1 << len(spots) {
		sum, count, last, ok := 0.0, 0, int64(math.MinInt64/2), true
		for i := range spots {
			if mask>>i&1 == 1 {
				ok = ok && (count == 0 || spots[i].start-last >= gap)
				sum, count, last = sum+spots[i].profit, count+1, spots[i].start
			}
		}
		if ok && count <= n {
			best = math.Max(best, sum)
		}
	}
	return best
}

// TestChooseAgainstAllSubsets: what is chosen keeps gap, count and labels; it
// is the best there is where the multiplier finds the count, and within the
// multiplier's bound always.
func TestChooseAgainstAllSubsets(t *testing.T) {
	r := rand.New(rand.NewPCG(2, 2))
	var c chooser
	exact, tried := 0, 0
	for range 3000 {
		spots := make([]spot, 1+r.IntN(10))
		for i := range spots {
			start := int64(r.IntN(4000)) * model.Micro
			spots[i] = spot{start: start, profit: 0.01 + r.Float64(), night: int32(start / (1000 * model.Micro))}
		}
		sortSpots(spots)
		w := &model.Want{PerNight: int32(r.IntN(3))}
		if r.IntN(3) > 0 {
			w.GapMin = int64(r.IntN(1500)) * model.Micro
			w.Spacing = w.GapMin
		}
		n := 1 + r.IntN(4)
		picked, mu := c.choose(w, spots, n, nil)
		if len(picked) > n || !slices.IsSorted(picked) || mu < 0 {
			t.Fatalf("%d picks of %d, multiplier %g: %v", len(picked), n, mu, picked)
		}
		sum := 0.0
		labels := map[int32]int32{}
		for k, i := range picked {
			sum += spots[i].profit
			if labels[spots[i].night]++; w.PerNight > 0 && labels[spots[i].night] > w.PerNight {
				t.Fatalf("%d of a label, per_night %d", labels[spots[i].night], w.PerNight)
			}
			if k > 0 && spots[i].start-spots[picked[k-1]].start < w.Spacing {
				t.Fatalf("two picks %d us apart, gap %d", spots[i].start-spots[picked[k-1]].start, w.Spacing)
			}
		}
		gap := w.Spacing
		if gap > 0 {
			gap += cadenceEase
		}
		best := brute(spots, gap, n)
		if sum > best+1e-9 {
			t.Fatalf("profit %g is over the best %g", sum, best)
		}
		if w.PerNight > 0 {
			continue
		}
		tried++
		if sum > best-1e-9 {
			exact++
		} else if sum < best/2 {
			t.Errorf("profit %g where %g can be had", sum, best)
		}
	}
	if exact < tried*9/10 {
		t.Errorf("the best was chosen in %d of %d trials only", exact, tried)
	}
	t.Logf("the best was chosen in %d of %d trials", exact, tried)
}

// free time costs nothing.
type gratis struct{ n int }

func (g gratis) At(int, int64) float64 { return 0 }
func (g gratis) Range() (least, most []float64) {
	return make([]float64, g.n), make([]float64, g.n)
}

// picture is what a state says, without the order of unordered lists.
type picture struct {
	score  int64
	got    []int32
	lists  [][]entry
	visits map[int32]visit
	of     [][]int32
}

func (s *state) picture() picture {
	p := picture{score: s.score, got: slices.Clone(s.got), visits: map[int32]visit{}}
	for i := range s.nights {
		p.lists = append(p.lists, slices.Clone(s.nights[i].list))
	}
	for i := range s.of {
		ids := slices.Clone(s.of[i])
		slices.Sort(ids)
		p.of = append(p.of, ids)
		for _, id := range ids {
			p.visits[id] = s.visits[id]
		}
	}
	return p
}

// differ says what two pictures differ in, or "".
func (p *picture) differ(q *picture) string {
	switch {
	case p.score != q.score:
		return "score"
	case !slices.Equal(p.got, q.got):
		return "visits got"
	case !slices.EqualFunc(p.of, q.of, slices.Equal):
		return "visits of wants"
	case !slices.EqualFunc(p.lists, q.lists, slices.Equal):
		return "nights"
	}
	for id, v := range p.visits {
		if v != q.visits[id] {
			return "a visit"
		}
	}
	return ""
}

// TestRollbackRestoresTheState replaces fields at random, ejecting others, and
// takes it back.
func TestRollbackRestoresTheState(t *testing.T) {
	changed := 0
	for seed := range uint64(12) {
		k, err := trial.Build(t.Context(), trial.Survey(seed+300), 1)
		if err != nil {
			t.Fatal(err)
		}
		p := k.Problem
		x := New(p, gratis{len(p.Scopes) * p.Nights}, make([]float64, len(p.Wants)), seed)
		x.Construct(t.Context(), 0, nil)
		x.s.verify()
		r := rand.New(rand.NewPCG(seed, 3))
		for range 60 {
			before := x.s.picture()
			x.s.begin()
			for range 1 + r.IntN(3) {
				x.pl.replace(r.IntN(len(p.FieldWant)-1), float64(r.IntN(2))*p.MaxValue*r.Float64())
			}
			if now := x.s.picture(); now.differ(&before) != "" {
				changed++
			}
			if r.IntN(3) == 0 {
				x.s.commit()
				x.s.verify()
				continue
			}
			x.s.rollback()
			x.s.verify()
			after := x.s.picture()
			if what := before.differ(&after); what != "" {
				t.Fatalf("seed %d: rollback leaves another state: %s", seed, what)
			}
		}
	}
	if changed < 50 {
		t.Errorf("only %d transactions changed anything", changed)
	}
}
