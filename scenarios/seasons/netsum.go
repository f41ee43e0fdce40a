package seasons

import (
	"fmt"
	"math/bits"
	"slices"
	"strings"

	"nightwright/scheduler/tables"
)

// CompareTables is a comparison worked up from its parts.
type CompareTables struct {
	Networks  []tables.NetworkRow
	Pairs     []tables.PairRow
	Worths    []tables.WorthRow
	Strengths []tables.StrengthRow
	Summary   CompareSummary
}

// CompareSummary is compare.json.
type CompareSummary struct {
	Kind    string `json:"kind"`
	Run     string `json:"run"`
	Seasons int    `json:"seasons"`
	// Shapley is exact, sampled or none.
	Shapley   string              `json:"shapley"`
	Networks  []tables.NetworkRow `json:"-"`
	Best      string              `json:"most_coverage"`
	BestValue string              `json:"most_coverage_per_cost"`
}

// CompareKind marks compare.json.
const CompareKind = "nightwright comparison"

// JoinCompare works up the rows of all parts of a comparison.
func JoinCompare(run string, rows []tables.PartRow) (*CompareTables, error) {
	rows = slices.Clone(rows)
	tables.Parts.Sort(rows)
	b := newBoard(rows)
	out := &CompareTables{Summary: CompareSummary{Kind: CompareKind, Run: run, Seasons: len(b.seasons)}}
	if err := out.networks(b); err != nil {
		return nil, err
	}
	out.worths(b)
	out.strengths(b)
	tables.Networks.Sort(out.Networks)
	tables.Pairs.Sort(out.Pairs)
	tables.Worths.Sort(out.Worths)
	tables.Strengths.Sort(out.Strengths)
	return out, nil
}

// first returns a number that holds for all seasons.
func (b *board) first(cast, what, item string) float64 {
	if v := b.of(cast, what, item); len(v) > 0 {
		return v[0]
	}
	return 0
}

// sitesCast returns the cast of a set of sites with the given names.
func sitesCast(names string) string { return castSites + names }

func (out *CompareTables) networks(b *board) error {
	var values [][]float64
	raw := map[string]string{}
	for _, cast := range b.casts {
		name, ok := strings.CutPrefix(cast, castNetwork)
		if !ok {
			continue
		}
		items := b.items(cast, whatSites)
		if len(items) != 1 {
			return fmt.Errorf("network %q has %d lists of sites; want parts of one comparison", name, len(items))
		}
		raw[name] = sitesCast(items[0])
		r := tables.NetworkRow{Network: name, Sites: strings.ReplaceAll(items[0], separator, "; "), Order: int64(b.first(cast, whatSites, items[0])), Cost: b.first(cast, whatCost, ""),
			DarkGap: b.first(cast, whatDark, ""), Round: b.first(cast, whatRound, "")}
		out.Networks = append(out.Networks, r)
	}
	tables.Networks.Sort(out.Networks)
	for i := range out.Networks {
		r := &out.Networks[i]
		x := b.list(raw[r.Network], whatCoverage)
		if len(x) != len(b.seasons) {
			return fmt.Errorf("network %q has %d seasons of %d; want parts of one comparison", r.Network, len(x), len(b.seasons))
		}
		values = append(values, x)
		m, d := MeanInterval(x), Paired(x, values[0])
		r.Coverage, r.Low, r.High = m.Mean, m.Low, m.High
		r.Difference, r.DifferenceLow, r.DifferenceHigh = d.Mean, d.Low, d.High
		if r.Cost > 0 {
			r.PerCost = r.Coverage / r.Cost
		}
		r.Redundancy = 1
		for _, site := range b.items(raw[r.Network], whatDown) {
			if left := Ratio(b.of(raw[r.Network], whatDown, site), x).Mean; r.WorstDown == "" || left < r.Redundancy {
				r.WorstDown, r.Redundancy = site, left
			}
		}
	}
	best(out.Networks, values)
	top, value := 0, 0
	for i := range out.Networks {
		if out.Networks[i].Coverage > out.Networks[top].Coverage {
			top = i
		}
		if out.Networks[i].PerCost > out.Networks[value].PerCost {
			value = i
		}
		for j := range out.Networks {
			if i == j {
				continue
			}
			d := Paired(values[i], values[j])
			more := 0
			for k := range values[i] {
				if values[i][k] > values[j][k] {
					more++
				}
			}
			out.Pairs = append(out.Pairs, tables.PairRow{Network: out.Networks[i].Network, Other: out.Networks[j].Network,
				Mean: d.Mean, Low: d.Low, High: d.High, WinChance: float64(more) / float64(len(values[i]))})
		}
	}
	if len(out.Networks) > 0 {
		out.Summary.Best, out.Summary.BestValue = out.Networks[top].Network, out.Networks[value].Network
	}
	return nil
}

// best fills the share of seasons in which each network gets most.
func best(rows []tables.NetworkRow, values [][]float64) {
	if len(rows) == 0 || len(values[0]) == 0 {
		return
	}
	for k := range values[0] {
		top, ties := values[0][k], 0
		for i := range values {
			top = max(top, values[i][k])
		}
		for i := range values {
			if values[i][k] == top {
				ties++
			}
		}
		for i := range values {
			if values[i][k] == top {
				rows[i].BestChance += 1 / float64(ties) / float64(len(values[0]))
			}
		}
	}
}

// worths works out what each site adds, season by season.
func (out *CompareTables) worths(b *board) {
	out.Summary.Shapley = "none"
	all := ""
	for _, cast := range b.casts {
		if len(b.keys[[2]string{cast, whatSite}]) > 0 {
			all = cast
		}
	}
	if all == "" {
		return
	}
	list := strings.Split(strings.TrimPrefix(all, castSites), separator)
	n := len(list)
	value := func(set uint64) []float64 {
		if set == 0 {
			return make([]float64, len(b.seasons))
		}
		var in []string
		for i := range list {
			if set>>i&1 != 0 {
				in = append(in, list[i])
			}
		}
		return b.list(sitesCast(strings.Join(in, separator)), whatCoverage)
	}
	shapley := out.shares(b, all, list, value)
	full := uint64(1)<<n - 1
	for i, name := range list {
		m := Paired(value(full), value(full&^(1<<i)))
		r := tables.WorthRow{Site: name, Cost: b.first(all, whatSite, name), Marginal: m.Mean, MarginalLow: m.Low, MarginalHigh: m.High, Alone: MeanInterval(value(1 << i)).Mean}
		if shapley != nil {
			s := shapley[i]
			r.Shapley, r.ShapleyLow, r.ShapleyHigh = s.Mean, s.Low, s.High
			if r.Cost > 0 {
				r.ShapleyPerCost = r.Shapley / r.Cost
			}
		}
		out.Worths = append(out.Worths, r)
	}
}

// shares returns each site's Shapley share with its interval, or nil.
func (out *CompareTables) shares(b *board, all string, list []string, value func(uint64) []float64) []Interval {
	n, seasons := len(list), len(b.seasons)
	if b.first(all, whatShapley, "") == 0 {
		return nil
	}
	if orders := b.items(all, whatOrder); len(orders) > 0 {
		out.Summary.Shapley = "sampled"
		return sampledShares(orders, list, value)
	}
	if n > exactSites {
		return nil
	}
	table := make([][]float64, 1<<n)
	for s := range table {
		if table[s] = value(uint64(s)); len(table[s]) != seasons {
			return nil
		}
	}
	out.Summary.Shapley = "exact"
	per := make([][]float64, n)
	game := make([]float64, 1<<n)
	for k := range seasons {
		for s := range game {
			game[s] = table[s][k]
		}
		for i, x := range Shapley(n, game) {
			per[i] = append(per[i], x)
		}
	}
	shares := make([]Interval, n)
	for i := range shares {
		shares[i] = MeanInterval(per[i])
	}
	return shares
}

// Shapley returns the players' shares of a game (Shapley 1953): the mean over
// all orders of what a player adds to those before,
//
//	phi_i = sum over S without i of |S|! (n-|S|-1)! / n! [v(S + i) - v(S)],
//
// value being indexed by sets as bits, value[0] the empty one's.
func Shapley(n int, value []float64) []float64 {
	weight := make([]float64, n) // by |S|
	for s := range weight {
		// |S|! (n-|S|-1)! / n! = 1 / (n choose |S| (n-|S|)).
		c := 1.0
		for k := range s {
			c = c * float64(n-k) / float64(k+1)
		}
		weight[s] = 1 / (c * float64(n-s))
	}
	out := make([]float64, n)
	for s := range value {
		for i := range n {
			if s>>i&1 == 0 {
				out[i] += weight[bits.OnesCount(uint(s))] * (value[s|1<<i] - value[s])
			}
		}
	}
	return out
}

// sampledShares estimates Shapley shares from some orders of the sites. The
// interval is over pairs of an order and its reverse, of means over seasons.
func sampledShares(orders, list []string, value func(uint64) []float64) []Interval {
	per := make([][]float64, len(list))
	pair := make([]float64, len(list))
	for k, o := range orders {
		words := strings.Split(o, separator)[1:]
		set, before := uint64(0), 0.0
		for _, name := range words {
			i := slices.Index(list, name)
			set |= 1 << i
			now := MeanInterval(value(set)).Mean
			pair[i] += (now - before) / 2
			before = now
		}
		if k%2 == 1 {
			for i := range pair {
				per[i] = append(per[i], pair[i])
			}
			clear(pair)
		}
	}
	out := make([]Interval, len(list))
	for i := range out {
		out[i] = MeanInterval(per[i])
	}
	return out
}

// strengths compares where each site's credit falls with where the whole
// network's does.
func (out *CompareTables) strengths(b *board) {
	for _, cast := range b.casts {
		items := b.items(cast, whatCredit)
		bySite, byKind, byBin := map[string]float64{}, map[string]float64{}, map[string]float64{}
		sum := func(item string) float64 {
			s := 0.0
			for _, x := range b.of(cast, whatCredit, item) {
				s += x
			}
			return s
		}
		for _, item := range items {
			w := strings.Split(item, separator)
			x := sum(item)
			bySite[w[0]+separator+w[1]] += x
			byKind[w[1]] += x
			byBin[w[1]+separator+w[2]] += x
		}
		for _, item := range items {
			w := strings.Split(item, separator)
			if byBin[w[1]+separator+w[2]] == 0 {
				continue // nobody observes there
			}
			r := tables.StrengthRow{Site: w[0], Kind: w[1], Bin: w[2], Network: byBin[w[1]+separator+w[2]] / byKind[w[1]]}
			if s := bySite[w[0]+separator+w[1]]; s > 0 {
				r.Share = sum(item) / s
			}
			r.Strength = r.Share / r.Network
			out.Strengths = append(out.Strengths, r)
		}
	}
}
