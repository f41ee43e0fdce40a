package seasons

import (
	"context"
	"fmt"
	"math"

	"nightwright/constraints"
	"nightwright/constraints/survey"
	"nightwright/scenarios/weather"
	"nightwright/scheduler/model"
	"nightwright/visibility"
)

// Stage is what all simulated seasons of a survey share. It is immutable and
// safe for concurrent use.
type Stage struct {
	Survey    *survey.Survey
	p         *model.Problem
	climates  []weather.Climate
	clear     []bool // by site: the survey gives no weather, it is always open
	first     int64  // first hour of the skies, hours since 1970
	hours     int
	nights    []stageNight // [scope*Nights+night]
	blocks    int
	climate   []float64 // [block] the month's clear fraction at its site
	capacity  []float64 // [block] open s, less what keep_free leaves
	qualities []uint8   // of options, a byte a block
	busy      []float64 // [want*scopes+scope] time a visit takes with usual gaps, s; 0: not served
	spread    []int32   // [want] nights from one visit to the next, at least 1
	often     []int32   // [want] visits that one night can hold
	total     float64   // C of everything wanted at quality 1, for scales
	rate      float64   // C per second: a usual price
}

// stageNight is one telescope-night: its hours are blocks, numbered on.
type stageNight struct {
	hour    int64 // hour number of the first block
	block   int32 // its index
	blocks  int32
	options []option
}

// option is a want that a telescope-night could serve, with its mean quality
// in each of the blocks from, from+1, ... to.
type option struct {
	want     int32
	from, to uint8 // blocks of the night, inclusive
	at       int32 // into qualities
}

// blockTime is the length of a block of prices, s: the weather's hour.
const blockTime = 3600

// NewStage prepares a survey. The calendar may hold losses that are known.
func NewStage(ctx context.Context, sv *survey.Survey, sky *visibility.Sky, cal *constraints.Calendar, win *constraints.Windows, workers int) (*Stage, error) {
	p, err := model.NewProblem(sv, sky, cal, win, workers)
	if err != nil {
		return nil, err
	}
	st := &Stage{Survey: sv, p: p}
	for i := range sv.Sites {
		c, ok := weather.Of(&sv.Sites[i])
		st.climates = append(st.climates, c)
		st.clear = append(st.clear, !ok)
	}
	// Nights of a label reach at most a day over either side of its date.
	st.first = int64(sv.FirstNight-2) * 24
	st.hours = (sv.Nights() + 5) * 24
	st.setWants()
	if err := st.setNights(ctx, workers); err != nil {
		return nil, err
	}
	return st, nil
}

// AlwaysOpen lists the sites without weather in the survey: their sky is
// taken as always open.
func (st *Stage) AlwaysOpen() []string {
	var out []string
	for i, clear := range st.clear {
		if clear {
			out = append(out, st.Survey.Sites[i].Name)
		}
	}
	return out
}

func (st *Stage) setWants() {
	p := st.p
	n := len(p.Wants)
	st.busy = make([]float64, n*len(p.Scopes))
	st.spread, st.often = make([]int32, n), make([]int32, n)
	var value, time float64
	for i := range p.Wants {
		w := &p.Wants[i]
		for _, t := range w.Scopes {
			sum := 0.0
			for k := range w.Steps {
				sum += model.Sec(p.Length(&w.Steps[k], t) + max(p.Scopes[t].TypicalGap, p.Scopes[t].LeastGap))
			}
			st.busy[i*len(p.Scopes)+int(t)] = sum
		}
		gap := model.Sec(w.Spacing)
		st.spread[i], st.often[i] = 1, 1
		switch {
		case gap > 86400:
			st.spread[i] = int32(math.Ceil(gap/86400 - 0.15)) // a visit may come earlier in its night
		case gap < 43200:
			// As many as a night of eight hours holds.
			st.often[i] = int32(28800/math.Max(gap, 1200)) + 1
			if w.PerNight > 0 {
				st.often[i] = min(st.often[i], w.PerNight)
			}
		}
		st.total += float64(w.Visits) * w.Value
		if len(w.Scopes) > 0 {
			value += float64(w.Visits) * w.Value
			time += float64(w.Visits) * st.busy[i*len(p.Scopes)+int(w.Scopes[0])]
		}
	}
	if time > 0 {
		st.rate = value / time
	}
}

// setNights lists what each telescope-night could serve.
func (st *Stage) setNights(ctx context.Context, workers int) error {
	p := st.p
	st.nights = make([]stageNight, len(p.Scopes)*p.Nights)
	for i := range st.nights {
		sn := &st.nights[i]
		open := p.Open(i/p.Nights, i%p.Nights)
		if len(open) == 0 {
			continue
		}
		sn.hour = open[0].From / (blockTime * model.Micro)
		last := (open[len(open)-1].To - 1) / (blockTime * model.Micro)
		sn.block, sn.blocks = int32(st.blocks), int32(min(last-sn.hour+1, 255))
		st.blocks += int(sn.blocks)
	}
	st.capacity, st.climate = make([]float64, st.blocks), make([]float64, st.blocks)
	byScope := make([][]int32, len(p.Scopes))
	for w := range p.Wants {
		for _, t := range p.Wants[w].Scopes {
			byScope[t] = append(byScope[t], int32(w))
		}
	}
	data := make([][]uint8, len(st.nights))
	model.Parallel(workers, len(st.nights), func(i int) {
		if ctx.Err() == nil && st.nights[i].blocks > 0 {
			data[i] = st.fill(i/p.Nights, i%p.Nights, byScope[i/p.Nights])
		}
	})
	total := 0
	for i := range data {
		for k := range st.nights[i].options {
			st.nights[i].options[k].at += int32(total)
		}
		total += len(data[i])
	}
	if total > math.MaxInt32 {
		return fmt.Errorf("seasons: the survey has %d hours in which a field may be observed, more than this program holds; want fewer fields or nights", total)
	}
	st.qualities = make([]uint8, 0, total)
	for i := range data {
		st.qualities = append(st.qualities, data[i]...)
		data[i] = nil
	}
	return ctx.Err()
}

// fill lists the options of one telescope-night and sets its capacities.
func (st *Stage) fill(t, n int, wants []int32) []uint8 {
	p := st.p
	sn := &st.nights[t*p.Nights+n]
	open := p.Open(t, n)
	for b := range sn.blocks {
		st.climate[sn.block+b] = st.climates[p.Scopes[t].Site].Clear[weather.Month(sn.hour+int64(b))]
	}
	for _, o := range open {
		for b := range sn.blocks {
			from := (sn.hour + int64(b)) * blockTime * model.Micro
			if s := min(o.To, from+blockTime*model.Micro) - max(o.From, from); s > 0 {
				st.capacity[sn.block+b] += model.Sec(s) * (1 - p.Scopes[t].KeepFree)
			}
		}
	}
	var data []uint8
	row := make([]uint8, sn.blocks)
	for _, w := range wants {
		from, to := st.optionRow(row, t, n, &p.Wants[w])
		if from > to {
			continue
		}
		sn.options = append(sn.options, option{w, uint8(from), uint8(to), int32(len(data))})
		data = append(data, row[from:to+1]...)
	}
	return append([]uint8(nil), data...)
}

// optionRow fills row with a want's mean quality over the starts that each
// block holds, and returns the first and last block with any; from > to: none.
func (st *Stage) optionRow(row []uint8, t, n int, w *model.Want) (from, to int) {
	p := st.p
	clear(row)
	sn := &st.nights[t*p.Nights+n]
	scope := &p.Scopes[t]
	first, q := p.Shelf.Row(scope.Class, n, w.Steps[0].Row)
	from, to = len(row), -1
	if len(q) == 0 {
		return from, to
	}
	span := st.span(w, int32(t))
	half := p.Length(&w.Steps[0], int32(t)) / 2
	for _, win := range p.Windows.Of(int(w.Unit), int(scope.Class), n) {
		lo, hi := p.Inward(win)
		for _, o := range p.Open(t, n) {
			a, b := max(lo, o.From), min(hi, o.To)-span
			if b < a {
				continue
			}
			for k := max(0, int(a/(blockTime*model.Micro)-sn.hour)); k < len(row); k++ {
				x := max(a, (sn.hour+int64(k))*blockTime*model.Micro)
				y := min(b, (sn.hour+int64(k)+1)*blockTime*model.Micro-1)
				if y < x {
					break
				}
				if v := st.meanQuality(w, scope, n, first, q, x+half, y+half); v > row[k] {
					row[k] = v
				}
				if row[k] > 0 {
					from, to = min(from, k), max(to, k)
				}
			}
		}
	}
	return from, to
}

// span is the longest time from a visit's first start to its last end, us.
func (st *Stage) span(w *model.Want, t int32) int64 {
	var span int64
	for k := range w.Steps {
		span += w.Steps[k].After + w.Steps[k].Tolerance
	}
	return span + st.p.Length(&w.Steps[len(w.Steps)-1], t)
}

// meanQuality averages the shelf's bytes over middles from x to y; other steps
// of a set enter with their own filter at the same instants.
func (st *Stage) meanQuality(w *model.Want, scope *model.Scope, n int, first int32, q []uint8, x, y int64) uint8 {
	const step = model.ShelfStep * model.Micro
	sum, count := 0, 0
	add := func(first int32, q []uint8) {
		for k := x / step; k <= y/step; k++ {
			if i := int(k - int64(first)); i >= 0 && i < len(q) {
				sum += int(q[i])
				count++
			}
		}
	}
	add(first, q)
	for k := 1; k < len(w.Steps); k++ {
		if w.Steps[k].Row != w.Steps[0].Row {
			f, more := st.p.Shelf.Row(scope.Class, n, w.Steps[k].Row)
			add(f, more)
		}
	}
	if count == 0 {
		return 0
	}
	mean := sum / count
	if float64(mean) < 255*w.MinQuality {
		return 0
	}
	return uint8(mean)
}

// scopesOf returns the telescopes of a set of sites; nil takes all.
func (st *Stage) scopesOf(sites []int) []bool {
	active := make([]bool, len(st.p.Scopes))
	for t := range active {
		active[t] = sites == nil
		for _, s := range sites {
			active[t] = active[t] || int(st.p.Scopes[t].Site) == s
		}
	}
	return active
}
