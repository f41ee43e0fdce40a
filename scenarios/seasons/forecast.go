package seasons

import (
	"context"
	"fmt"
	"math"
	"slices"

	"nightwright/constraints/survey"
	"nightwright/scenarios/weather"
	"nightwright/scheduler/model"
	"nightwright/scheduler/tables"
	"nightwright/visibility"
)

// Asked is what seasons are asked for, whole or a shard of them.
type Asked struct {
	Run     string // what makes two parts belong together
	Seed    uint64
	Seasons int
	Shard   int // 1..Shards
	Shards  int
	Workers int
	Report  func(model.Progress) // nil: none
}

// bounds returns the seasons of the shard, [from, to).
func (a *Asked) bounds() (from, to int) {
	return (a.Shard - 1) * a.Seasons / a.Shards, a.Shard * a.Seasons / a.Shards
}

func (a *Asked) tell(phase string, done, total int) {
	if a.Report != nil {
		a.Report(model.Progress{Phase: phase, Done: done, Total: total})
	}
}

// Hindsight plans a season with its weather known, as Stage.Known has it. It
// returns the plan's coverage and ceiling.
type Hindsight func(ctx context.Context, sv *survey.Survey, losses [][]visibility.Interval) (coverage, ceiling float64, err error)

// ForecastAsk is what a forecast is asked for.
type ForecastAsk struct {
	Asked
	Policies  []Policy
	List      []model.Exposure // the plan's
	Prices    []model.Price    // the plan's
	Hindsight int              // seasons, from the first, that are planned with hindsight
	Plan      Hindsight
}

// The words of what parts hold.
const (
	whatCoverage  = "coverage"
	whatVisits    = "visits"
	whatFinished  = "finished"
	whatOpen      = "open_h"
	whatLost      = "lost_h"
	whatUsed      = "used_h"
	whatWasted    = "wasted_h"
	whatNight     = "night"       // item: its date
	whatFieldBy   = "finished_by" // item: field, a space and a date
	whatCeiling   = "ceiling"
	castHindsight = "hindsight"
	sums          = -1 // season of sums over a shard
	always        = -2 // season of what holds for all
)

// Forecast plays the seasons of a shard under each policy and returns the
// part's rows, sorted.
func Forecast(ctx context.Context, st *Stage, ask ForecastAsk) ([]tables.PartRow, error) {
	pw := &partWriter{ask: &ask.Asked}
	from, to := ask.bounds()
	ends := monthEnds(st.Survey)
	for _, policy := range ask.Policies {
		phase := "seasons, " + policy.String()
		ask.tell(phase, 0, to-from)
		troupe := NewTroupe(st, Cast{Policy: policy, List: ask.List, Prices: ask.Prices})
		cast := policy.String()
		by := make([]int64, len(st.Survey.Fields)*len(ends))
		err := troupe.Play(ctx, ask.Seed, from, to, ask.Workers, func(o *Outcome) {
			pw.season(cast, o)
			for n, x := range o.Nights {
				pw.add(int64(o.Season), cast, whatNight, (st.Survey.FirstNight + survey.Day(n)).String(), x)
			}
			for f, n := range o.Finish {
				for m, end := range ends {
					if n >= 0 && st.Survey.FirstNight+survey.Day(n) <= end {
						by[f*len(ends)+m]++
					}
				}
			}
			ask.tell(phase, o.Season-from+1, to-from)
		})
		if err != nil {
			return nil, err
		}
		for f := range st.Survey.Fields {
			for m, end := range ends {
				pw.add(sums, cast, whatFieldBy, st.Survey.Fields[f].Name+" "+end.String(), float64(by[f*len(ends)+m]))
			}
		}
	}
	for k := from; k < min(to, ask.Hindsight); k++ {
		ask.tell("hindsight", k-from, min(to, ask.Hindsight)-from)
		sv, losses := st.Known(ask.Seed, k)
		coverage, ceiling, err := ask.Plan(ctx, sv, losses)
		if err != nil {
			return nil, fmt.Errorf("season %d with hindsight: %w", k, err)
		}
		pw.add(int64(k), castHindsight, whatCoverage, "", coverage)
		pw.add(int64(k), castHindsight, whatCeiling, "", ceiling)
	}
	tables.Parts.Sort(pw.rows)
	return pw.rows, nil
}

// Known returns a season with its weather known: the survey without reserved
// blocks, and, for each telescope, the lost time of a calendar: the closed
// hours, and the reserved blocks where the season had them, so that they don't
// move to where the sky happens to open.
func (st *Stage) Known(seed uint64, season int) (*survey.Survey, [][]visibility.Interval) {
	sky := weather.NewSky(st.climates, st.first, st.hours)
	sky.Draw(seed, uint64(season))
	sv := *st.Survey
	sv.Telescopes = slices.Clone(sv.Telescopes)
	losses := make([][]visibility.Interval, len(sv.Telescopes))
	for t := range losses {
		for h := st.first; h < st.first+int64(st.hours); h++ {
			if sky.Open(sv.Telescopes[t].Site, h) {
				continue
			}
			from, to := float64(h*blockTime), float64((h+1)*blockTime)
			if n := len(losses[t]); n > 0 && losses[t][n-1].To == from {
				losses[t][n-1].To = to
				continue
			}
			losses[t] = append(losses[t], visibility.Interval{From: from, To: to})
		}
		for n := range st.p.Nights {
			losses[t] = append(losses[t], st.p.Calendar.Reserved(t, n)...)
		}
		sv.Telescopes[t].Reserved = nil
	}
	return &sv, losses
}

// monthEnds lists the last days of the months that a survey's nights lie in,
// the last cut at its last night.
func monthEnds(sv *survey.Survey) []survey.Day {
	var out []survey.Day
	for d := sv.FirstNight; d <= sv.LastNight; d++ {
		if d == sv.LastNight || (d+1).Month() != d.Month() {
			out = append(out, d)
		}
	}
	return out
}

// partWriter gathers a part's rows.
type partWriter struct {
	ask  *Asked
	rows []tables.PartRow
}

func (w *partWriter) add(season int64, cast, what, item string, value float64) {
	w.rows = append(w.rows, tables.PartRow{
		Run: w.ask.Run, Shard: int64(w.ask.Shard), Shards: int64(w.ask.Shards), Season: season,
		Cast: cast, What: what, Item: item, Value: value,
	})
}

// season adds the totals of a season.
func (w *partWriter) season(cast string, o *Outcome) {
	k := int64(o.Season)
	w.add(k, cast, whatCoverage, "", o.Coverage)
	w.add(k, cast, whatVisits, "", float64(o.Visits))
	w.add(k, cast, whatFinished, "", float64(o.Finished))
	w.add(k, cast, whatOpen, "", o.Open)
	w.add(k, cast, whatLost, "", o.Lost)
	w.add(k, cast, whatUsed, "", o.Used)
	w.add(k, cast, whatWasted, "", o.Wasted)
}

// units is the size of whole numbers that sums of coverage are kept in, so
// that they don't depend on the order of summing.
const units = 1e12

func whole(c float64) float64 { return math.Round(c * units) }
