package dual_test

import (
	"cmp"
	"math"
	"math/rand/v2"
	"os"
	"slices"
	"testing"

	"nightwright/constraints"
	"nightwright/scheduler/dual"
	"nightwright/scheduler/model"
	"nightwright/scheduler/trial"
	"nightwright/visibility"
)

// long asks for more rounds than a usual test run has time for.
var long = os.Getenv("NIGHTWRIGHT_LONG") != ""

func rounds(usual, many int) int {
	if long {
		return many
	}
	return usual
}

// randomRates sets prices in the style of a number: none, even, wild, or
// free time in a few slots alone.
func randomRates(a *dual.Ascent, r *rand.Rand, scale float64) {
	switch style := r.IntN(4); style {
	case 0:
		a.SetRates(func(int, int) float64 { return 0 })
	case 1:
		even := scale * r.Float64()
		a.SetRates(func(int, int) float64 { return even })
	case 2:
		a.SetRates(func(int, int) float64 { return scale * math.Exp(3*r.NormFloat64()-2) })
	case 3:
		a.SetRates(func(int, int) float64 {
			if r.IntN(6) == 0 {
				return 0
			}
			return 5 * scale * r.Float64()
		})
	}
}

// typicalRate is C per second that a field's visit is worth, for scales.
func typicalRate(p *model.Problem) float64 {
	w := &p.Wants[0]
	return p.MaxValue / (w.Steps[0].Duration + 10)
}

// one is a legal visit of a want, with what it earns: value less price.
type one struct {
	start int64
	night int32
	end   int64 // of its last exposure
	worth float64
}

// sampler finds legal visits on the exact path.
type sampler struct {
	k *trial.Kit
	a *dual.Ascent
	r *rand.Rand
}

// starts lists instants at which a step may begin on a telescope-night by the
// windows (all of them legal), dense enough to come near the best, and those
// that a flaw of the bound would show at: slot edges, moonrises, twilight
// minutes, first and last moments.
func (s *sampler) starts(w *model.Want, step int, t int32, n int) []int64 {
	p := s.k.Problem
	length := p.Length(&w.Steps[step], t)
	var out []int64
	for _, win := range p.Windows.Of(int(w.Unit), int(p.Scopes[t].Class), n) {
		wf, wt := p.Inward(win)
		for _, o := range p.Open(int(t), n) {
			lo, hi := max(wf, o.From), min(wt, o.To)-length
			if hi < lo {
				continue
			}
			out = append(out, lo, hi)
			slot := model.MicroOf(p.Survey.Slot)
			for at := lo / slot * slot; at <= hi+slot; at += slot {
				for _, x := range []int64{at, at - 1, at - length, at - length - p.Scopes[t].LeastGap, at - length/2, at - length/2 + 1e6} {
					if x >= lo && x <= hi {
						out = append(out, x)
					}
				}
			}
			for at := lo; at <= hi; at += model.MicroOf(20 + 100*s.r.Float64()) {
				out = append(out, at)
			}
			for _, edge := range s.moonEdges(t, lo+length/2, hi+length/2) {
				for _, d := range []int64{-3e6, -1e5, 1e5, 1e6, 3e6} {
					if x := edge + d - length/2; x >= lo && x <= hi {
						out = append(out, x)
					}
				}
			}
		}
	}
	slices.Sort(out)
	return slices.Compact(out)
}

// moonEdges returns the instants between two at which the Moon rises or sets.
func (s *sampler) moonEdges(t int32, from, to int64) []int64 {
	place := constraints.Place(&s.k.Survey.Sites[s.k.Problem.Scopes[t].Site])
	up := func(us int64) bool { return s.k.Exact.Moon(place, model.Sec(us)).Altitude > 0 }
	var out []int64
	const step = 1200e6
	for a := from; a < to; a += step {
		b := min(a+step, to)
		if up(a) == up(b) {
			continue
		}
		for b-a > 1000 {
			if m := (a + b) / 2; up(m) == up(a) {
				a = m
			} else {
				b = m
			}
		}
		out = append(out, b)
		a = b
	}
	return out
}

// quality is the exposure's, on the exact path.
func (s *sampler) quality(w *model.Want, step int, t int32, start int64) float64 {
	p := s.k.Problem
	mid := model.Sec(start + p.Length(&w.Steps[step], t)/2)
	place := constraints.Place(&s.k.Survey.Sites[p.Scopes[t].Site])
	f := &s.k.Survey.Fields[w.Field]
	now := s.k.Exact.At(mid)
	star := now.Star(place, visibility.Position{RA: f.RA, Dec: f.Dec, PMRA: f.PMRA, PMDec: f.PMDec})
	sun, moon := now.Sun(place), now.Moon(place)
	return visibility.Quality(s.k.Survey.Filters[w.Steps[step].Filter], visibility.Geometry{
		SinAltitude: math.Sin(star.Altitude), SunAltitude: sun.Altitude, MoonAltitude: moon.Altitude,
		MoonSeparation: visibility.Separation(star, moon.Horizontal), MoonPhaseAngle: moon.PhaseAngle,
	})
}

// worth is what one exposure earns: value times quality, less the price of
// the open time that it and the least gap after it take.
func (s *sampler) worth(w *model.Want, step int, t int32, n int, start int64) float64 {
	p := s.k.Problem
	end := start + p.Length(&w.Steps[step], t) + p.Scopes[t].LeastGap
	q := s.quality(w, step, t, start)
	if q < w.MinQuality {
		return math.Inf(-1) // not legal
	}
	return w.Value/float64(len(w.Steps))*q - s.a.Prices().Cost(int(t), n, start, end)
}

// visits lists legal visits of a want.
func (s *sampler) visits(w *model.Want) []one {
	p := s.k.Problem
	var out []one
	for _, t := range w.Scopes {
		for n := range p.Nights {
			first := s.starts(w, 0, t, n)
			if len(w.Steps) == 1 {
				for _, at := range first {
					out = append(out, one{at, int32(n), at + p.Length(&w.Steps[0], t), s.worth(w, 0, t, n, at)})
				}
				continue
			}
			out = s.sets(out, w, t, n, first)
		}
	}
	return out
}

// sets appends, for each first start, the best set that goes on greedily.
func (s *sampler) sets(out []one, w *model.Want, t int32, n int, first []int64) []one {
	p := s.k.Problem
	known := map[[2]int64]float64{}
	worth := func(j int, at int64) float64 {
		key := [2]int64{int64(j), at}
		v, ok := known[key]
		if !ok {
			v = s.worth(w, j, t, n, at)
			known[key] = v
		}
		return v
	}
	var later [][]int64
	for j := 1; j < len(w.Steps); j++ {
		later = append(later, s.starts(w, j, t, n))
	}
	for i := 0; i < len(first); i += 1 + s.r.IntN(4) {
		at, sum, ok := first[i], worth(0, first[i]), true
		for j := 1; j < len(w.Steps) && ok; j++ {
			st := &w.Steps[j]
			free := at + p.Length(&w.Steps[j-1], t) + p.Scopes[t].LeastGap
			lo, hi := max(free, at+st.After-st.Tolerance), at+st.After+st.Tolerance
			best, bestAt := math.Inf(-1), int64(0)
			list := later[j-1]
			from, _ := slices.BinarySearch(list, lo)
			for ; from < len(list) && list[from] <= hi; from++ {
				if v := worth(j, list[from]); v > best {
					best, bestAt = v, list[from]
				}
			}
			ok, sum, at = !math.IsInf(best, -1), sum+best, bestAt
		}
		if ok {
			last := len(w.Steps) - 1
			out = append(out, one{first[i], int32(n), at + p.Length(&w.Steps[last], t), sum})
		}
	}
	return out
}

// best picks from visits a legal set worth the most: by dynamic programming
// over starts when the gap alone binds, greedily otherwise.
func best(w *model.Want, list []one, gap int64) float64 {
	slices.SortFunc(list, func(a, b one) int { return cmp.Compare(a.start, b.start) })
	if w.PerNight > 0 || len(w.Steps) > 1 || len(list)*int(w.Visits) > 2e6 {
		return greedy(w, list, gap)
	}
	// f[k][i]: best of at most k visits among the first i.
	before := make([]float64, len(list)+1)
	for range w.Visits {
		now := make([]float64, len(list)+1)
		p := 0
		for i := range list {
			for p < i && list[i].start-list[p].start >= gap {
				p++
			}
			q := p
			if gap == 0 {
				q = i
			}
			now[i+1] = math.Max(now[i], before[q]+list[i].worth)
		}
		before = now
	}
	return before[len(list)]
}

func greedy(w *model.Want, list []one, gap int64) float64 {
	order := slices.Clone(list)
	slices.SortFunc(order, func(a, b one) int { return cmp.Compare(b.worth, a.worth) })
	var taken []one
	sum := 0.0
	for _, v := range order {
		if v.worth <= 0 || len(taken) == int(w.Visits) {
			break
		}
		same, ok := int32(0), true
		for _, o := range taken {
			d := max(v.start-o.start, o.start-v.start)
			apart := v.start >= o.end || o.start >= v.end
			ok = ok && d >= gap && (len(w.Steps) == 1 || apart)
			if o.night == v.night {
				same++
			}
		}
		if ok && (w.PerNight == 0 || same < w.PerNight) {
			taken = append(taken, v)
			sum += v.worth
		}
	}
	return sum
}

// TestNoVisitsOfAFieldBeatTheOracle: at random prices, no legal set of visits
// of a demand, its qualities taken from the exact path, earns more than the
// oracle says. It is the heart of the ceiling's proof.
func TestNoVisitsOfAFieldBeatTheOracle(t *testing.T) {
	// Seeds at which an earlier oracle was beaten, at a moonset.
	seeds := []uint64{186, 754, 1069}
	for seed := range uint64(rounds(40, 3000)) {
		seeds = append(seeds, seed)
	}
	var c contest
	for i, seed := range seeds {
		c.run(t, seed, long || i < 3)
	}
	t.Logf("%d demands; %d came within 1 %% of the bound, the nearest within %.2g of a visit", c.demands, c.near, c.closest)
	if c.near < c.demands/10 {
		t.Errorf("only %d of %d demands came near their bound; the test has no teeth", c.near, c.demands)
	}
}

// contest counts demands whose visits were held against the oracle.
type contest struct {
	demands, near int
	closest       float64 // of a visit
}

// run takes the demands of one survey, or a quarter of them.
func (c *contest) run(t *testing.T, seed uint64, all bool) {
	t.Helper()
	sv := trial.Survey(seed)
	k, err := trial.Build(t.Context(), sv, 2)
	if err != nil {
		t.Fatal(err)
	}
	r := rand.New(rand.NewPCG(seed, 2))
	a := dual.NewAscent(k.Problem)
	randomRates(a, r, typicalRate(k.Problem))
	a.SetMu(func(i int) float64 { return k.Problem.Wants[i].Value * r.Float64() * float64(r.IntN(2)) })
	width := []float64{60, 150, 300, 600, 731}[r.IntN(5)]
	a.Prove(width)
	s := &sampler{k, a, r}
	for i := range k.Problem.Wants {
		if i%4 != int(seed%4) && !all {
			continue
		}
		w := &k.Problem.Wants[i]
		d := &sv.Programs[w.Program].Demands[w.Demand]
		list := s.visits(w)
		got, bound := best(w, list, int64(math.Ceil(d.GapMin*1e6))), a.WantBound(i)
		if got > bound*(1+1e-12)+1e-15 {
			t.Errorf("seed %d, want %d (width %g s, %d visits, gap %g s, %d steps): a legal set earns %.12g, the bound is %.12g (%.3g of a visit)",
				seed, i, width, w.Visits, d.GapMin, len(w.Steps), got, bound, (got-bound)/w.Value)
		}
		if bound <= 0 || len(list) == 0 {
			continue
		}
		if room := (bound - got) / w.Value; c.demands == 0 || room < c.closest {
			c.closest = room
		}
		c.demands++
		if bound-got < 0.01*w.Value*float64(w.Visits) {
			c.near++
		}
	}
}
