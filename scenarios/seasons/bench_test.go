package seasons

import (
	"context"
	"os"
	"runtime"
	"strconv"
	"testing"

	"nightwright/scenarios/starter"
	"nightwright/scheduler"
)

// BenchmarkSeason plays one season of the medium family (4 sites x 60 nights x
// 1,000 fields, 70 % clear) on one core.
func BenchmarkSeason(b *testing.B) {
	k := build(b, cloudy(starter.Family("medium", 1), 0.7, 14*3600))
	for _, policy := range []Policy{Densest, FixedPrices, Resolved} {
		b.Run(policy.String(), func(b *testing.B) {
			pl := NewTroupe(k.Stage, Cast{Policy: policy}).player()
			season := 0
			for b.Loop() {
				if o := pl.Play(1, season); o.Visits == 0 {
					b.Fatal("nothing was observed")
				}
				season++
			}
		})
	}
}

// BenchmarkHeadline plays one season of the season starter (6 sites x 182 nights
// x 6,000 fields) on one core, without re-solving.
func BenchmarkHeadline(b *testing.B) {
	k := build(b, loaded(b, "season"))
	for _, policy := range []Policy{Densest, FixedPrices} {
		b.Run(policy.String(), func(b *testing.B) {
			pl := NewTroupe(k.Stage, Cast{Policy: policy}).player()
			season := 0
			for b.Loop() {
				if o := pl.Play(1, season); o.Visits == 0 {
					b.Fatal("nothing was observed")
				}
				season++
			}
		})
	}
}

// TestMemoryStays: a hundred seasons more take no memory more.
func TestMemoryStays(t *testing.T) {
	if testing.Short() {
		return // the race detector's rounds have enough without it
	}
	k := build(t, small())
	troupe := NewTroupe(k.Stage, Cast{Policy: FixedPrices})
	heap := func(seasons int) uint64 {
		var m runtime.MemStats
		var most uint64
		err := troupe.Play(context.Background(), 1, 0, seasons, 2, func(o *Outcome) {
			if o.Season%20 == 19 {
				runtime.GC()
				runtime.ReadMemStats(&m)
				most = max(most, m.HeapAlloc)
			}
		})
		if err != nil {
			t.Fatal(err)
		}
		return most
	}
	few, many := heap(20), heap(120)
	if float64(many) > 1.1*float64(few)+1e5 {
		t.Errorf("20 seasons hold %d bytes, 120 hold %d", few, many)
	}
}

// TestMediumAgainstHindsight measures what the contributor's guide tells: the
// medium family under 70 % clear sky against plans that knew the weather, over
// NIGHTWRIGHT_LONG seasons. It runs when asked only, for it takes minutes.
func TestMediumAgainstHindsight(t *testing.T) {
	n, _ := strconv.Atoi(os.Getenv("NIGHTWRIGHT_LONG"))
	if n < 2 {
		return // not skipped: there is nothing that could be missing
	}
	k := build(t, cloudy(starter.Family("medium", 1), 0.7, 14*3600))
	var plans, limits []float64
	for season := range n {
		known, losses := k.Known(1, season)
		out, err := hindsight(k, scheduler.Params{Effort: "quick", Seed: 1}, known, losses)
		if err != nil {
			t.Fatal(err)
		}
		plans, limits = append(plans, out.Coverage), append(limits, out.Ceiling)
	}
	for _, policy := range []Policy{Resolved, FixedPrices, Densest} {
		var got []float64
		for _, o := range play(t, k.Stage, Cast{Policy: policy}, 1, n, 2) {
			got = append(got, o.Coverage)
		}
		p, l := Ratio(got, plans), Ratio(got, limits)
		t.Logf("%-9v mean %.4f; of hindsight plans %.2f %% (%.2f to %.2f), of ceilings %.2f %% (%.2f to %.2f)", policy,
			MeanInterval(got).Mean, 100*p.Mean, 100*p.Low, 100*p.High, 100*l.Mean, 100*l.Low, 100*l.High)
		if policy == Resolved && p.High < 0.95 {
			t.Errorf("resolved nightly is at %.1f %% of hindsight planning; want 95 or more", 100*p.Mean)
		}
	}
}
