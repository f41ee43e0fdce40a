package seasons

import (
	"context"
	"fmt"
	"math"
	"slices"
	"strings"

	"nightwright/constraints/survey"
)

// exactChoices is how many sets of K sites are all tried.
const exactChoices = 130

// Choices returns every set of k sites as a network, and false when there are
// too many to try them all.
func Choices(sv *survey.Survey, k int) ([]survey.Network, bool) {
	n := len(sv.Sites)
	count := 1.0
	for i := range k {
		count = count * float64(n-i) / float64(i+1)
	}
	if count > exactChoices+0.5 {
		return nil, false
	}
	var out []survey.Network
	var grow func(from int, in []int)
	grow = func(from int, in []int) {
		if len(in) == k {
			out = append(out, named(sv, in))
			return
		}
		for i := from; i < n; i++ {
			grow(i+1, append(slices.Clone(in), i))
		}
	}
	grow(0, nil)
	return out, true
}

// named is a network called by its sites.
func named(sv *survey.Survey, sites []int) survey.Network {
	sites = slices.Clone(sites)
	slices.Sort(sites)
	var words []string
	for _, i := range sites {
		words = append(words, sv.Sites[i].Name)
	}
	return survey.Network{Name: strings.Join(words, " + "), Sites: sites}
}

// Greed is what a greedy choice found.
type Greed struct {
	Networks []survey.Network // the choice after each step
	Coverage []float64        // mean of each
	// Bound is above the mean coverage of every set of k sites, as far as more
	// sites never help a larger set more than a smaller one: for the sets S
	// that were met, f(S) + the k largest gains f(S + s) - f(S), the least of
	// them (Nemhauser, Wolsey & Fisher 1978). Slack is by how much a gain rose
	// from one set to the next at most: 0 where that holds.
	Bound, Slack float64
	Played       int // sets
}

// Greedy adds, k times, the site that raises the mean coverage most. The
// seasons are the whole of what is asked for.
func Greedy(ctx context.Context, st *Stage, ask CompareAsk, k int) (*Greed, error) {
	n := len(st.Survey.Sites)
	if k < 1 || k > n {
		return nil, fmt.Errorf("seasons: %d of %d sites; want 1 to %d", k, n, n)
	}
	g := &Greed{Bound: math.Inf(1)}
	value := func(sites []int) (float64, error) {
		sum := 0.0
		troupe := NewTroupe(st, Cast{Policy: FixedPrices, Sites: sites})
		g.Played++
		err := troupe.Play(ctx, ask.Seed, 0, ask.Seasons, ask.Workers, func(o *Outcome) { sum += o.Coverage })
		return sum / float64(ask.Seasons), err
	}
	var in []int
	base := 0.0
	before := make([]float64, n)
	for i := range before {
		before[i] = math.Inf(1)
	}
	for step := 0; ; step++ {
		ask.tell("choice", step, k+1)
		gains := make([]float64, n)
		best := -1
		for i := range n {
			if slices.Contains(in, i) {
				continue
			}
			v, err := value(append(slices.Clone(in), i))
			if err != nil {
				return nil, err
			}
			gains[i] = v - base
			g.Slack = max(g.Slack, gains[i]-before[i])
			before[i] = gains[i]
			if best < 0 || gains[i] > gains[best] {
				best = i
			}
		}
		top := sorted(gains)
		slices.Reverse(top)
		bound := base
		for _, x := range top[:k] {
			bound += max(0, x)
		}
		g.Bound = min(g.Bound, bound)
		if step == k || best < 0 {
			return g, nil
		}
		in = append(in, best)
		base += gains[best]
		g.Networks, g.Coverage = append(g.Networks, named(st.Survey, in)), append(g.Coverage, base)
	}
}
