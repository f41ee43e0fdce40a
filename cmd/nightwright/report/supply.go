package report

import (
	"fmt"
	"math"

	"nightwright/cmd/nightwright/draw"
	"nightwright/constraints"
	"nightwright/constraints/survey"
	"nightwright/scheduler/model"
	"nightwright/visibility"
)

const (
	raBins   = 12
	supplies = 600.0 // s, how finely open time is spread over right ascension
)

// balances weighs what is asked for and planned against the open time, by
// right ascension and by month.
func (g *gathered) balances() (ascension, months []draw.Balance) {
	ascension, months = make([]draw.Balance, raBins), make([]draw.Balance, len(g.months))
	for i := range ascension {
		ascension[i].Label = fmt.Sprintf("%d-%d h", i*24/raBins, (i+1)*24/raBins)
	}
	for i := range months {
		months[i].Label = g.months[i]
	}
	g.supply(ascension, months)
	for i := range g.Tables.Visits {
		v := &g.Tables.Visits[i]
		h := (v.Exposure + v.GapBefore) / 3600
		ascension[raBin(v.RA*degree)].Planned += h
		if n := int(v.Night) - int(g.Survey.FirstNight); n >= 0 && n < len(g.monthOf) {
			months[g.monthOf[n]].Planned += h
		}
	}
	spread := g.spread()
	for f := range g.Survey.Fields {
		h := g.asked(f)
		ascension[raBin(g.Survey.Fields[f].RA)].Asked += h
		for m, part := range spread[f] {
			months[m].Asked += h * part
		}
	}
	return ascension, months
}

func raBin(ra float64) int {
	k := int(ra / (2 * math.Pi) * raBins)
	return min(max(k, 0), raBins-1)
}

// supply spreads each telescope's open hours, as the nights table has them,
// over the right ascensions that pass its meridian while it is open.
func (g *gathered) supply(ascension, months []draw.Balance) {
	hours := map[string]map[int32]float64{}
	for i := range g.Tables.Nights {
		n := &g.Tables.Nights[i]
		if hours[n.Telescope] == nil {
			hours[n.Telescope] = map[int32]float64{}
		}
		hours[n.Telescope][n.Night] = n.OpenHours
	}
	bins := make([][raBins]float64, len(g.Survey.Telescopes))
	model.Parallel(g.Workers, len(bins), func(t int) {
		tel := &g.Survey.Telescopes[t]
		long := g.Survey.Sites[tel.Site].Longitude
		for n := range g.Survey.Nights() {
			open := g.Calendar.OpenHours(t, n)
			if open == 0 {
				continue
			}
			// Time that was lost since stands in no table by the minute: it is
			// taken evenly from the night.
			scale := hours[tel.Name][int32(g.Survey.FirstNight)+int32(n)] / open
			for _, iv := range g.Calendar.Open(t, n) {
				for from := iv.From; from < iv.To; from += supplies {
					to := min(from+supplies, iv.To)
					lst := g.Exact.At((from + to) / 2).SiderealTime(long)
					bins[t][raBin(lst)] += (to - from) / 3600 * scale
				}
			}
		}
	})
	for t := range bins {
		for k, h := range bins[t] {
			ascension[k].Has += h
		}
		for n := range g.monthOf {
			months[g.monthOf[n]].Has += hours[g.Survey.Telescopes[t].Name][int32(g.Survey.FirstNight)+int32(n)]
		}
	}
}

// asked is the telescope time that a field's visits would take, h: exposures
// and a readout each, as a mean over the telescopes that may serve it.
func (g *gathered) asked(f int) float64 {
	fd := &g.Survey.Fields[f]
	sum := 0.0
	demands := g.Survey.Programs[fd.Program].Demands
	for d := range demands {
		one, n := 0.0, 0
		for t := range g.Survey.Telescopes {
			tel := &g.Survey.Telescopes[t]
			if !g.Survey.Qualifies(fd, &demands[d], t) {
				continue
			}
			n++
			for _, e := range demands[d].Exposures {
				one += e.Duration*tel.ExposureScale + tel.Readout
			}
		}
		if n > 0 {
			sum += one / float64(n) * float64(demands[d].Visits) / 3600
		}
	}
	return sum
}

// spread says, for each field, in which months the open time lies in which it
// stands high enough at some site: parts that add up to 1, or to 0 when there
// is none. Every third night is looked at, in steps of 20 min.
func (g *gathered) spread() [][]float64 {
	const nights, step = 3, 1200.0
	fields := len(g.Survey.Fields)
	out := make([][]float64, fields)
	for f := range out {
		out[f] = make([]float64, len(g.months))
	}
	positions := constraints.Positions(g.Survey)
	limit := make([]float64, fields)
	for f := range limit {
		limit[f] = sinLimit(&g.Survey.Fields[f])
	}
	var sampled []int
	for n := 0; n < g.Survey.Nights(); n += nights {
		sampled = append(sampled, n)
	}
	counts := make([][]int, len(sampled))
	model.Parallel(g.Workers, len(sampled), func(k int) {
		counts[k] = g.highSlots(sampled[k], step, positions, limit)
	})
	for k, n := range sampled {
		for f, c := range counts[k] {
			out[f][g.monthOf[n]] += float64(c)
		}
	}
	for f := range out {
		sum := 0.0
		for _, v := range out[f] {
			sum += v
		}
		for m := range out[f] {
			if sum > 0 {
				out[f][m] /= sum
			}
		}
	}
	return out
}

// highSlots counts, for each field, the steps of a night in which it stands
// high enough at a site with a telescope open, over all sites.
func (g *gathered) highSlots(night int, step float64, positions []visibility.Position, limit []float64) []int {
	counts := make([]int, len(positions))
	for s := range g.Survey.Sites {
		iv := g.Calendar.Night(s, night)
		n := int((iv.To - iv.From) / step)
		open := make([]bool, n)
		some := false
		for _, t := range g.Survey.Sites[s].Telescopes {
			for _, o := range g.Calendar.Open(t, night) {
				for k := range open {
					at := iv.From + float64(k)*step
					open[k] = open[k] || at >= o.From && at < o.To
					some = some || open[k]
				}
			}
		}
		if !some {
			continue
		}
		d := visibility.NewDirections(g.Exact, positions, iv.From, iv.To)
		h := visibility.NewHorizons(g.Exact, constraints.Place(&g.Survey.Sites[s]), iv.From, step, n)
		words := h.AboveWords()
		bits := make([]uint64, words)
		for f := range positions {
			clear(bits)
			d.Above(h, limit[f], f, f+1, bits)
			for k := range open {
				if open[k] && bits[k/64]>>(k%64)&1 == 1 {
					counts[f]++
				}
			}
		}
	}
	return counts
}

// sinLimit is the sine of the altitude above which the loosest of a field's
// demands may be observed, by altitude and airmass alone.
func sinLimit(f *survey.Field) float64 {
	least := math.Pi / 2
	for i := range f.Rules {
		r := &f.Rules[i]
		least = min(least, max(r.AltitudeMin, constraints.AltitudeOfAirmass(r.AirmassMax)))
	}
	return math.Sin(least)
}
