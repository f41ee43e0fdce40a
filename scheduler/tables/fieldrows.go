package tables

import (
	"cmp"
	"context"
	"slices"

	"nightwright/constraints"
	"nightwright/scheduler/model"
)

// fieldChunk is how many fields are one piece of work.
const fieldChunk = 32

// fieldRows makes the rows of all fields and of their demands, in id order.
func (b *builder) fieldRows(ctx context.Context) ([]FieldRow, []DemandRow, error) {
	n := len(b.sv.Fields)
	rows := make([]FieldRow, n)
	model.Parallel(b.workers, (n+fieldChunk-1)/fieldChunk, func(c int) {
		if ctx.Err() != nil {
			return
		}
		u := usable{b: b}
		for f := c * fieldChunk; f < min((c+1)*fieldChunk, n); f++ {
			rows[f] = b.fieldRow(f, &u)
		}
	})
	if err := errStopped(ctx); err != nil {
		return nil, nil, err
	}
	var demands []DemandRow
	for f := range n {
		demands = append(demands, b.demandRows(f)...)
	}
	return rows, demands, nil
}

func (b *builder) fieldRow(field int, u *usable) FieldRow {
	f := &b.sv.Fields[field]
	row := FieldRow{
		Field: f.Name, Program: b.sv.Programs[f.Program].Name, Weight: b.sv.WeightOf(f),
		RA: written(f.RA), Dec: written(f.Dec), VisitsWanted: b.tally.wanted[field],
		Coverage: b.tally.sum[field] / float64(b.tally.wanted[field]), UsableHours: u.hours(field),
	}
	if b.tally.got[field] == b.tally.wanted[field] {
		row.Bonus = b.sv.FinishBonus
	}
	var starts []int64
	for _, v := range b.tally.of(field) {
		if !v.counts {
			continue
		}
		if v.done {
			row.VisitsDone++
		} else {
			row.VisitsPlanned++
		}
		starts = append(starts, v.start)
	}
	slices.Sort(starts)
	if n := len(starts); n > 0 {
		row.First, row.Last = starts[0], starts[n-1]
	}
	for i := 1; i < len(starts); i++ {
		gap := float64(starts[i]-starts[i-1]) / (86400 * 1e6)
		if row.LongestGap == nil || gap > *row.LongestGap {
			row.LongestGap = &gap
		}
	}
	row.LimitedBy = u.limit(field)
	return row
}

func (b *builder) demandRows(field int) []DemandRow {
	f := &b.sv.Fields[field]
	demands := b.sv.Programs[f.Program].Demands
	rows := make([]DemandRow, len(demands))
	last := make([]int64, len(demands))
	for d := range demands {
		rows[d] = DemandRow{Field: f.Name, Demand: demands[d].Name, Wanted: int64(demands[d].Visits)}
	}
	for _, v := range b.tally.of(field) {
		if !v.counts {
			continue
		}
		r := &rows[v.demand]
		if r.Planned+r.Done > 0 && constraints.GapWishBroken(float64(last[v.demand])/1e6, float64(v.start)/1e6, &demands[v.demand]) {
			r.GapMaxBreaches++
		}
		last[v.demand] = v.start
		if v.done {
			r.Done++
		} else {
			r.Planned++
		}
	}
	return rows
}

// nightRows makes a row for each telescope and night of the period.
func (b *builder) nightRows() []NightRow {
	sv, nights := b.sv, b.sv.Nights()
	rows := make([]NightRow, len(sv.Telescopes)*nights)
	model.Parallel(b.workers, len(sv.Sites), func(site int) {
		for n := range nights {
			night := b.cal.Night(site, n)
			illumination := b.exact.Moon(b.sites[site], (night.From+night.To)/2).Illumination
			for _, t := range sv.Sites[site].Telescopes {
				rows[t*nights+n] = NightRow{
					Site: sv.Sites[site].Name, Telescope: sv.Telescopes[t].Name, Night: int32(sv.FirstNight) + int32(n),
					DarkHours: b.cal.DarkHours(site, n), OpenHours: b.cal.OpenHours(t, n),
					MoonIllumination: illumination, PricePerHour: b.meanPrice(t, n),
				}
			}
		}
	})
	at := func(i int32) *NightRow {
		if s := &b.shots[i]; s.Night >= 0 && int(s.Night) < nights {
			return &rows[int(s.Telescope)*nights+int(s.Night)]
		}
		return new(NightRow) // done before the period: in no night of it
	}
	for i := range b.shots {
		r, s := at(int32(i)), &b.shots[i]
		r.ExposureHours += float64(s.End-s.Start) / 3.6e9
		r.UsedHours += float64(s.End-s.Start)/3.6e9 + b.looks[i].gap/3600
	}
	for i := range b.tally.visits {
		at(b.tally.visits[i].shots[0]).Visits++
	}
	return rows
}

// meanPrice returns the mean of a telescope's slot prices over a night's open
// time; a slot without a price counts as 0.
func (b *builder) meanPrice(t, night int) float64 {
	prices := b.out.Prices
	sum, open := 0.0, 0.0
	for _, o := range b.cal.Open(t, night) {
		open += o.To - o.From
		k, _ := slices.BinarySearchFunc(prices, o.From-b.sv.Slot, func(p model.Price, from float64) int {
			return cmp.Or(cmp.Compare(int(p.Telescope), t), cmp.Compare(float64(p.SlotStart), from))
		})
		for ; k < len(prices) && int(prices[k].Telescope) == t && float64(prices[k].SlotStart) < o.To; k++ {
			from := float64(prices[k].SlotStart)
			if part := min(o.To, from+b.sv.Slot) - max(o.From, from); part > 0 {
				sum += part * prices[k].PerHour
			}
		}
	}
	if open == 0 {
		return 0
	}
	return sum / open
}

func (b *builder) priceRows() []PriceRow {
	rows := make([]PriceRow, len(b.out.Prices))
	for i, p := range b.out.Prices {
		rows[i] = PriceRow{Telescope: b.sv.Telescopes[p.Telescope].Name, SlotStart: p.SlotStart * 1e6, PricePerHour: p.PerHour}
	}
	return rows
}
