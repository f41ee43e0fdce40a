package seasons

import (
	"bytes"
	"context"
	"math"
	"os"
	"path/filepath"
	"strings"
	"testing"

	"nightwright/constraints/survey"
	"nightwright/scheduler/tables"
)

// compared plays a comparison of a survey in some shards and joins it.
func compared(t *testing.T, k *stageKit, networks []survey.Network, seasons, shards int) (*CompareTables, []tables.PartRow) {
	t.Helper()
	var rows []tables.PartRow
	for s := 1; s <= shards; s++ {
		part, err := Compare(context.Background(), k.Stage, CompareAsk{
			Asked:    Asked{Run: "compare; seed=4", Seed: 4, Seasons: seasons, Shard: s, Shards: shards, Workers: 2},
			Networks: networks, Shapley: true,
		})
		if err != nil {
			t.Fatal(err)
		}
		rows = append(rows, part...)
	}
	out, err := JoinCompare("compare; seed=4", rows)
	if err != nil {
		t.Fatal(err)
	}
	return out, rows
}

// TestCompare checks a comparison against plain runs of its networks.
func TestCompare(t *testing.T) {
	k := build(t, demo(t, 5))
	const seasons = 16
	got, _ := compared(t, k, k.Survey.Networks, seasons, 1)
	values := map[string][]float64{}
	for i, n := range k.Survey.Networks {
		for _, o := range play(t, k.Stage, Cast{Policy: FixedPrices, Sites: n.Sites}, 4, seasons, 1) {
			values[n.Name] = append(values[n.Name], o.Coverage)
		}
		r := got.Networks[i]
		m := MeanInterval(values[n.Name])
		if r.Network != n.Name || math.Abs(r.Coverage-m.Mean) > 1e-12 || math.Abs(r.Low-m.Low) > 1e-12 {
			t.Errorf("%s: %+v; want a mean of %.6f", n.Name, r, m.Mean)
		}
		d := Paired(values[n.Name], values[k.Survey.Networks[0].Name])
		if math.Abs(r.Difference-d.Mean) > 1e-12 || math.Abs(r.DifferenceHigh-d.High) > 1e-12 {
			t.Errorf("%s: difference %.6f; want %.6f", n.Name, r.Difference, d.Mean)
		}
		if !(r.Redundancy > 0 && r.Redundancy < 1) || r.WorstDown == "" {
			t.Errorf("%s: %.3f is left when %q is down", n.Name, r.Redundancy, r.WorstDown)
		}
	}
	best := 0.0
	for _, r := range got.Networks {
		best += r.BestChance
	}
	near(t, "sum of the chances to be best", best, 1, 1e-12)
	// Shares add up to the coverage of all sites (efficiency).
	sum := 0.0
	for _, w := range got.Worths {
		sum += w.Shapley
		if w.Marginal > w.Alone {
			t.Errorf("%s adds %.4f to the others and gets %.4f alone; sites share fields", w.Site, w.Marginal, w.Alone)
		}
	}
	near(t, "sum of Shapley shares", sum, got.Networks[0].Coverage, 1e-9)
	// The northern site is best at northern fields.
	top := map[string]float64{}
	bin := map[string]string{}
	for _, s := range got.Strengths {
		if s.Kind == "declination" && s.Network > 0.02 && s.Strength > top[s.Site] {
			top[s.Site], bin[s.Site] = s.Strength, s.Bin
		}
	}
	if !strings.HasPrefix(bin["Cinder Ridge"], "+") || !strings.HasPrefix(bin["Salt Mesa"], "-") {
		t.Errorf("best declinations: %v", bin)
	}
}

// TestPairsCutVariance: under the same skies the difference of two networks
// that share sites is known better than under skies of their own.
func TestPairsCutVariance(t *testing.T) {
	if testing.Short() {
		return // the race detector's rounds have enough without it
	}
	k := build(t, demo(t, 5))
	const seasons = 40
	run := func(sites []int, seed uint64) []float64 {
		var out []float64
		for _, o := range play(t, k.Stage, Cast{Policy: FixedPrices, Sites: sites}, seed, seasons, 2) {
			out = append(out, o.Coverage)
		}
		return out
	}
	all := run(nil, 4)
	same, other := Paired(all, run([]int{0, 1}, 4)), Paired(all, run([]int{0, 1}, 1004))
	if a, b := same.High-same.Low, other.High-other.Low; a > 0.7*b {
		t.Errorf("the paired interval is %.4f wide, the unpaired %.4f; want less than 0.7 of it", a, b)
	}
}

// TestSeedsOfSites: a site's own seasons don't depend on what else the survey
// has: it gets the same alone and as a set of one.
func TestSeedsOfSites(t *testing.T) {
	k := build(t, demo(t, 4))
	two := *k.Survey
	two.Sites, two.Telescopes = two.Sites[:2], two.Telescopes[:2]
	k2 := build(t, &two)
	a := play(t, k.Stage, Cast{Policy: Densest, Sites: []int{1}}, 8, 4, 1)
	b := play(t, k2.Stage, Cast{Policy: Densest, Sites: []int{1}}, 8, 4, 1)
	for i := range a {
		if a[i].Coverage != b[i].Coverage || a[i].Lost != b[i].Lost {
			t.Errorf("season %d: %.6f and %.6f", i, a[i].Coverage, b[i].Coverage)
		}
	}
}

// TestShardsGiveTheSameBytes: 1, 4 and 16 shards.
func TestShardsGiveTheSameBytes(t *testing.T) {
	k := build(t, demo(t, 3))
	var first []byte
	cuts, seasons := []int{1, 4, 16}, 17
	if testing.Short() {
		cuts, seasons = []int{1, 4}, 5
	}
	for _, shards := range cuts {
		got, _ := compared(t, k, k.Survey.Networks, seasons, shards)
		var all []byte
		for _, encode := range []func() ([]byte, error){
			func() ([]byte, error) { return tables.Networks.Encode(got.Networks) },
			func() ([]byte, error) { return tables.Pairs.Encode(got.Pairs) },
			func() ([]byte, error) { return tables.Worths.Encode(got.Worths) },
			func() ([]byte, error) { return tables.Strengths.Encode(got.Strengths) },
		} {
			b, err := encode()
			if err != nil {
				t.Fatal(err)
			}
			all = append(all, b...)
		}
		if first == nil {
			first = all
		}
		if !bytes.Equal(first, all) {
			t.Errorf("%d shards give other bytes than one", shards)
		}
	}
}

// TestGreedyFindsTheBestPair compares the greedy choice with all pairs.
func TestGreedyFindsTheBestPair(t *testing.T) {
	k := build(t, demo(t, 4))
	ask := CompareAsk{Asked: Asked{Seed: 2, Seasons: 8, Shard: 1, Shards: 1, Workers: 2}}
	g, err := Greedy(context.Background(), k.Stage, ask, 2)
	if err != nil {
		t.Fatal(err)
	}
	all, exact := Choices(k.Survey, 2)
	if !exact || len(all) != 3 {
		t.Fatalf("%d pairs of 3 sites, all tried: %v", len(all), exact)
	}
	best := 0.0
	for _, n := range all {
		sum := 0.0
		for _, o := range play(t, k.Stage, Cast{Policy: FixedPrices, Sites: n.Sites}, 2, 8, 1) {
			sum += o.Coverage / 8
		}
		best = max(best, sum)
	}
	last := g.Coverage[len(g.Coverage)-1]
	if len(g.Networks) != 2 || len(g.Networks[1].Sites) != 2 || last > best+1e-12 {
		t.Errorf("greedy: %+v, %v; the best pair has %.4f", g.Networks, g.Coverage, best)
	}
	// (1 - 1/e) of the best, where more sites never help more (Nemhauser et al.).
	if last < (1-1/math.E)*best-g.Slack || g.Bound+2*g.Slack < best {
		t.Errorf("greedy %.4f, bound %.4f (slack %.4f); the best pair has %.4f", last, g.Bound, g.Slack, best)
	}
	if _, exact := Choices(&survey.Survey{Sites: make([]survey.Site, 20)}, 6); exact {
		t.Error("38,760 sets are all to be tried")
	}
}

// TestSampledShapley: sampled shares of an additive game are exact, and the
// orders hold every site once.
func TestSampledShapley(t *testing.T) {
	sets, orders := Coalitions(12, nil, true, 1)
	if len(orders) != sampledOrders || len(sets) > 12*sampledOrders+30 {
		t.Fatalf("%d orders, %d sets", len(orders), len(sets))
	}
	worth := func(s uint64) []float64 {
		sum := 0.0
		for _, i := range sitesOf(s) {
			sum += float64(i + 1)
		}
		return []float64{sum}
	}
	list := strings.Split("abcdefghijkl", "")
	var items []string
	for k, o := range orders {
		var w []string
		for _, i := range o {
			w = append(w, list[i])
		}
		items = append(items, string(rune('A'+k))+separator+strings.Join(w, separator))
	}
	for i, s := range sampledShares(items, list, worth) {
		near(t, "share", s.Mean, float64(i+1), 1e-12)
		near(t, "its interval", s.High-s.Low, 0, 1e-12)
	}
}

// TestGatherRefuses goes through what a folder of parts can have wrong.
func TestGatherRefuses(t *testing.T) {
	part := func(run string, shard, shards int) []tables.PartRow {
		return []tables.PartRow{{Run: run, Shard: int64(shard), Shards: int64(shards), Cast: "fixed", What: whatCoverage, Value: 0.5}}
	}
	write := func(dir, name string, rows []tables.PartRow) {
		t.Helper()
		if err := tables.Parts.WriteFile(filepath.Join(dir, name), rows); err != nil {
			t.Fatal(err)
		}
	}
	dir := t.TempDir()
	const run = "forecast; seed=1; seasons=8"
	for k := 1; k <= 3; k++ {
		write(dir, PartName(k, 4), part(run, k, 4))
	}
	write(dir, "part-x.parquet", part(run, 3, 4))
	write(dir, "part-y.parquet", part("forecast; seed=2; seasons=8", 4, 4))
	write(dir, "part-z.parquet", part(run, 7, 9))
	if err := os.WriteFile(filepath.Join(dir, "part-w.parquet"), []byte("PAR1 no part PAR1"), 0o644); err != nil {
		t.Fatal(err)
	}
	_, _, err := ReadParts(dir)
	if err == nil {
		t.Fatal("a folder of wrong parts was taken")
	}
	for _, want := range []string{
		"part-x.parquet: it is shard 3/4, as part-003-of-004.parquet is", "part-y.parquet: it is no part of this run: it has seed=2, not seed=1",
		"part-z.parquet: it is one of 9 shards, the others are of 4", "part-w.parquet:", PartName(4, 4) + ": it is missing; run shard 4/4",
	} {
		if !strings.Contains(err.Error(), want) {
			t.Errorf("%v\nwant %q in it", err, want)
		}
	}
	for _, name := range []string{"part-x.parquet", "part-y.parquet", "part-z.parquet", "part-w.parquet"} {
		os.Remove(filepath.Join(dir, name))
	}
	write(dir, PartName(4, 4), part(run, 4, 4))
	if got, rows, err := ReadParts(dir); err != nil || got != run || len(rows) != 4 {
		t.Errorf("%q, %d rows, %v", got, len(rows), err)
	}
}
