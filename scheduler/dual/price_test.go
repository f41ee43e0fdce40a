package dual_test

import (
	"math"
	"math/rand/v2"
	"os"
	"testing"

	"nightwright/constraints/survey"
	"nightwright/scenarios/starter"
	"nightwright/scheduler/dual"
	"nightwright/scheduler/model"
	"nightwright/scheduler/trial"
)

// crowded is a survey of short visits that want more time than there is.
func crowded(nights, fields int) *survey.Survey {
	sv := starter.Family("medium", 1)
	sv.LastNight = sv.FirstNight + survey.Day(nights-1)
	sv.Sites, sv.Telescopes = sv.Sites[:2], sv.Telescopes[:2]
	sv.Fields = sv.Fields[:fields]
	return sv
}

// priceBin is the width of the start bins at which ceilings are compared here,
// s: that of the fine levels, which keep the best prices they meet.
const priceBin = 600

func fineLevel(steps int) dual.Level {
	return dual.Level{Memory: 0.8, Steps: steps, Eta: 0.1, EtaLast: 0.005}
}

// optimised finds prices for a problem, from those of another search where
// there are any, and returns the ceiling.
func optimised(t *testing.T, a *dual.Ascent, warm []model.Price, slot float64, steps int) float64 {
	t.Helper()
	if warm == nil {
		a.Soften(t.Context(), dual.Soft{Steps: 40, Tau: 0.1, TauLast: 0.001, Slot: 0.2, Night: 0.1, Most: 2, Network: 0.3, Memory: 0.5}, nil)
	} else {
		at := map[[2]int64]float64{}
		first := int64(math.MaxInt64)
		for _, p := range warm {
			at[[2]int64{int64(p.Telescope), p.SlotStart}] = p.PerHour / 3600
			first = min(first, p.SlotStart)
		}
		a.SetRatesAt(func(scope int, slotStart int64) float64 { return at[[2]int64{int64(scope), slotStart}] })
	}
	a.Run(t.Context(), fineLevel(steps), nil)
	return a.Ceiling(priceBin)
}

// TestMoreCapacityIsWorthAtMostItsPrice: with d more seconds in a slot, the
// relaxation at unchanged prices is worth d times the price more, to rounding;
// so the ceiling with prices sought afresh is at most that much higher
// (Lagrangian duality: Geoffrion 1974).
func TestMoreCapacityIsWorthAtMostItsPrice(t *testing.T) {
	sv := crowded(2, 250)
	k, err := trial.Build(t.Context(), sv, 2)
	if err != nil {
		t.Fatal(err)
	}
	steps := 20
	if testing.Short() {
		steps = 6
	}
	a := dual.NewAscent(k.Problem)
	before := optimised(t, a, nil, sv.Slot, steps)
	prices, kept := a.Prices().List(), a.Keep()
	r := rand.New(rand.NewPCG(1, 4))
	priced, fell := 0, 0
	for range 8 {
		p := prices[r.IntN(len(prices))]
		d := 3600 * r.Float64()
		more := dual.NewAscent(k.Problem)
		more.Restore(kept)
		more.AddCapacity(int(p.Telescope), p.SlotStart, d)
		most := p.PerHour * d / 3600
		same := more.Ceiling(priceBin)
		if diff := same - before - most; math.Abs(diff) > 1e-8*before {
			t.Errorf("%g s more at a price of %g an hour: the bound at the same prices rises by %.12g, not %.12g", d, p.PerHour, same-before, most)
		}
		more.Run(t.Context(), fineLevel(max(2, steps/4)), nil)
		after := more.Ceiling(priceBin)
		if after > before+most+1e-8 {
			t.Errorf("%g s more at a price of %g an hour: the ceiling rises by %.12g, over %.12g", d, p.PerHour, after-before, most)
		}
		if p.PerHour > 0 {
			priced++
		}
		if after < before+most-1e-9 {
			fell++
		}
	}
	if priced < 3 || fell == 0 {
		t.Errorf("%d of 8 slots had a price, %d searches found better prices; the test has no teeth", priced, fell)
	}
}

// TestSixMinutesMoreAreWorthWhatPricesSay opens six minutes at random in every
// telescope-night that were closed before. Summed over all, the ceiling with
// prices sought afresh rises by 0.7 to 1.1 of what the prices said: never by
// much more, for a price is the most an hour is worth, and not by much less,
// for six minutes are few enough for the price to hold.
func TestSixMinutesMoreAreWorthWhatPricesSay(t *testing.T) {
	if testing.Short() && os.Getenv("NIGHTWRIGHT_REQUIRE_ALL") != "1" {
		t.Skip("two price searches take long under the race detector")
	}
	const d = 360
	sv := crowded(4, 400)
	open, err := trial.Build(t.Context(), sv, 2)
	if err != nil {
		t.Fatal(err)
	}
	r := rand.New(rand.NewPCG(2, 4))
	shut := *sv
	shut.Telescopes = append([]survey.Telescope(nil), sv.Telescopes...)
	type stop struct {
		telescope int32
		from      float64
	}
	var stops []stop
	for i := range shut.Telescopes {
		for n := range sv.Nights() {
			spans := open.Problem.Open(i, n)
			s := spans[r.IntN(len(spans))]
			for range 100 {
				if s = spans[r.IntN(len(spans))]; s.To-s.From > 3600e6 {
					break
				}
			}
			// On the minutes of one slot, so that one price holds.
			at := model.Sec(s.From) + (model.Sec(s.To-s.From)-3000)*r.Float64()
			at = math.Ceil(at/sv.Slot)*sv.Slot + 120
			stops = append(stops, stop{int32(i), at})
			shut.Telescopes[i].Closures = append(shut.Telescopes[i].Closures, survey.Closure{From: at, To: at + d})
		}
	}
	closed, err := trial.Build(t.Context(), &shut, 2)
	if err != nil {
		t.Fatal(err)
	}
	const steps = 60
	a := dual.NewAscent(closed.Problem)
	optimised(t, a, nil, sv.Slot, steps)
	// Both go on from the same prices for as long, so that what is left of the
	// search's own error is the same.
	prices := a.Prices().List()
	b := dual.NewAscent(closed.Problem)
	without := optimised(t, b, prices, sv.Slot, steps)
	told := 0.0
	for _, p := range b.Prices().List() {
		for _, s := range stops {
			if p.Telescope == s.telescope && float64(p.SlotStart) == s.from-120 {
				told += p.PerHour * d / 3600
			}
		}
	}
	with := optimised(t, dual.NewAscent(open.Problem), prices, sv.Slot, steps)
	ratio := (with - without) / told
	t.Logf("ceiling %.6f, with six minutes more in %d nights %.6f: %.3g more, %.3f of the %.3g told", without, len(stops), with, with-without, ratio, told)
	if ratio < 0.7 || ratio > 1.1 {
		t.Errorf("six minutes more are worth %.3f of what the prices say; want 0.7 to 1.1", ratio)
	}
}
