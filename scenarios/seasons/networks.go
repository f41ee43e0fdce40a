package seasons

import (
	"context"
	"fmt"
	"math/bits"
	"math/rand/v2"
	"slices"
	"strings"

	"nightwright/constraints/survey"
	"nightwright/scheduler/tables"
)

// CompareAsk is what a comparison is asked for.
type CompareAsk struct {
	Asked
	Networks []survey.Network
	Shapley  bool // each site's part of the coverage of all
}

// The words of what a comparison's parts hold beside coverage.
const (
	whatDown    = "down"       // item: the site that is down for a month
	whatCredit  = "credit"     // item: site, bin kind, bin; whole units
	whatSites   = "sites"      // item: the network's sites; value: its place in the list
	whatCost    = "cost"       // of a network
	whatSite    = "site_cost"  // item: site
	whatDark    = "dark_gap_h" // of a network
	whatRound   = "round"      // of a network
	whatShapley = "shapley"    // 1: shares are wanted
	whatOrder   = "order"      // item: number and sites of one order
	castNetwork = "network "   // before a network's name
	castSites   = "sites "     // before a coalition, its sites in the survey's order
	separator   = "\x1f"       // in items; names hold no control characters
)

// exactSites is the number of sites up to which Shapley shares are exact.
const exactSites = 10

// sampledOrders is how many orders of sites they are sampled from above that.
const sampledOrders = 24

// Coalitions lists the sets of sites (bits by site id) that a comparison
// plays: those of the networks, every single-site removal of all sites, each
// site alone, and for Shapley shares all sets, or those of the sampled orders.
func Coalitions(sites int, networks []survey.Network, shapley bool, seed uint64) (sets []uint64, orders [][]int) {
	all := uint64(1)<<sites - 1
	add := func(s uint64) {
		if s != 0 && !slices.Contains(sets, s) {
			sets = append(sets, s)
		}
	}
	for _, n := range networks {
		add(bitsOf(n.Sites))
	}
	add(all)
	for i := range sites {
		add(all &^ (1 << i))
		add(1 << i)
	}
	switch {
	case !shapley:
	case sites <= exactSites:
		for s := uint64(1); s <= all; s++ {
			add(s)
		}
	default:
		rg := rand.New(rand.NewPCG(seed, 0x73686170))
		for range sampledOrders / 2 {
			// With its reverse, which takes variance away (antithetic orders).
			order := rg.Perm(sites)
			back := slices.Clone(order)
			slices.Reverse(back)
			orders = append(orders, order, back)
		}
		for _, o := range orders {
			s := uint64(0)
			for _, i := range o {
				s |= 1 << i
				add(s)
			}
		}
	}
	return sets, orders
}

func bitsOf(sites []int) uint64 {
	var s uint64
	for _, i := range sites {
		s |= 1 << i
	}
	return s
}

func sitesOf(s uint64) []int {
	var out []int
	for ; s != 0; s &= s - 1 {
		out = append(out, bits.TrailingZeros64(s))
	}
	return out
}

// names lists the sites of a set in the survey's order.
func names(sv *survey.Survey, s uint64) string {
	var out []string
	for _, i := range sitesOf(s) {
		out = append(out, sv.Sites[i].Name)
	}
	return strings.Join(out, separator)
}

// Compare plays the seasons of a shard on every set of sites that is needed,
// under the same skies, at prices of the expected weather, and returns the
// part's rows, sorted.
func Compare(ctx context.Context, st *Stage, ask CompareAsk) ([]tables.PartRow, error) {
	sv := st.Survey
	pw := &partWriter{ask: &ask.Asked}
	from, to := ask.bounds()
	sets, orders := Coalitions(len(sv.Sites), ask.Networks, ask.Shapley, ask.Seed)
	steps := len(sets)
	for _, n := range ask.Networks {
		steps += len(n.Sites)
	}
	done := 0
	for _, s := range sets {
		ask.tell("networks", done, steps)
		cast := castSites + names(sv, s)
		strengths := s == uint64(1)<<len(sv.Sites)-1
		troupe := NewTroupe(st, Cast{Policy: FixedPrices, Sites: sitesOf(s), Bins: strengths})
		credit := map[int]int64{}
		err := troupe.Play(ctx, ask.Seed, from, to, ask.Workers, func(o *Outcome) {
			pw.add(int64(o.Season), cast, whatCoverage, "", o.Coverage)
			for i, c := range o.Credit {
				credit[i] += int64(whole(c))
			}
		})
		if err != nil {
			return nil, err
		}
		if strengths {
			bins := Bins()
			for i := range len(sv.Sites) * len(bins) {
				b := bins[i%len(bins)]
				pw.add(sums, cast, whatCredit, strings.Join([]string{sv.Sites[i/len(bins)].Name, b.Kind, b.Name}, separator), float64(credit[i]))
			}
		}
		if err := st.downs(ctx, pw, &ask, s, cast, func() { done++; ask.tell("networks", done, steps) }); err != nil {
			return nil, err
		}
		done++
	}
	st.constants(pw, &ask, orders)
	tables.Parts.Sort(pw.rows)
	return pw.rows, nil
}

// monthNights is how long a site is down when redundancy is measured.
const monthNights = 30

// downs plays a network with each of its sites down for a month, which begins
// at a night drawn anew each season.
func (st *Stage) downs(ctx context.Context, pw *partWriter, ask *CompareAsk, set uint64, cast string, tick func()) error {
	named := slices.ContainsFunc(ask.Networks, func(n survey.Network) bool { return bitsOf(n.Sites) == set })
	if !named {
		return nil
	}
	from, to := ask.bounds()
	for _, i := range sitesOf(set) {
		troupe := NewTroupe(st, Cast{Policy: FixedPrices, Sites: sitesOf(set), Down: func(k int) Outage {
			rg := rand.New(rand.NewPCG(ask.Seed, uint64(k)))
			first := rg.IntN(max(1, st.p.Nights-monthNights+1))
			return Outage{i, first, first + monthNights}
		}})
		err := troupe.Play(ctx, ask.Seed, from, to, ask.Workers, func(o *Outcome) {
			pw.add(int64(o.Season), cast, whatDown, st.Survey.Sites[i].Name, o.Coverage)
		})
		if err != nil {
			return err
		}
		tick()
	}
	return nil
}

// constants adds what the survey alone says.
func (st *Stage) constants(pw *partWriter, ask *CompareAsk, orders [][]int) {
	sv := st.Survey
	for i, n := range ask.Networks {
		cast := castNetwork + n.Name
		cost := 0.0
		for _, s := range n.Sites {
			cost += sv.Sites[s].Cost
		}
		gap, round := st.clock(n.Sites)
		pw.add(always, cast, whatSites, names(sv, bitsOf(n.Sites)), float64(i+1))
		pw.add(always, cast, whatCost, "", cost)
		pw.add(always, cast, whatDark, "", gap)
		pw.add(always, cast, whatRound, "", round)
	}
	for i := range sv.Sites {
		pw.add(always, castSites+names(sv, uint64(1)<<len(sv.Sites)-1), whatSite, sv.Sites[i].Name, sv.Sites[i].Cost)
	}
	if ask.Shapley {
		pw.add(always, castSites+names(sv, uint64(1)<<len(sv.Sites)-1), whatShapley, "", 1)
	}
	for k, o := range orders {
		var list []string
		for _, s := range o {
			list = append(list, sv.Sites[s].Name)
		}
		pw.add(always, castSites+names(sv, uint64(1)<<len(sv.Sites)-1), whatOrder, fmt.Sprintf("%03d%s%s", k, separator, strings.Join(list, separator)), 1)
	}
}

// clock returns the longest stretch of the period in which no telescope of
// the sites is open, clouds apart, h, and the share of the period in which one
// is. The period counts from the first opening to the last closing.
func (st *Stage) clock(sites []int) (gap, share float64) {
	type span struct{ from, to int64 }
	var spans []span
	active := st.scopesOf(sites)
	for t := range st.p.Scopes {
		for n := range st.p.Nights {
			if active[t] {
				for _, o := range st.p.Open(t, n) {
					spans = append(spans, span{o.From, o.To})
				}
			}
		}
	}
	if len(spans) == 0 {
		return float64(st.p.Nights) * 24, 0
	}
	slices.SortFunc(spans, func(a, b span) int {
		if a.from != b.from {
			if a.from < b.from {
				return -1
			}
			return 1
		}
		return 0
	})
	begin, end, open := spans[0].from, spans[0].from, int64(0)
	for _, s := range spans {
		if s.from > end {

			gap = max(gap, float64(s.from-end)/3600e6)
			end = s.from
		}
		if s.to > end {
			open += s.to - end
			end = s.to
		}
	}
	return gap, float64(open) / float64(end-begin)
}
