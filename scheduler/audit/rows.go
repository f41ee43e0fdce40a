package audit

import (
	"fmt"
	"math"
	"slices"

	"nightwright/constraints/survey"
)

const dayMicro = 86400 * 1e6 // us in a day

// starts lists, by field and demand, the starts of the visits that count.
func (c *trial) starts() [][][]int64 {
	out := make([][][]int64, len(c.j.sv.Fields))
	for f := range out {
		out[f] = make([][]int64, len(c.j.sv.Programs[c.j.sv.Fields[f].Program].Demands))
	}
	for i := range c.visits {
		if s := c.visits[i].first(); s.counts {
			out[s.field][s.demand] = append(out[s.field][s.demand], s.Start)
		}
	}
	for f := range out {
		for d := range out[f] {
			slices.Sort(out[f][d])
		}
	}
	return out
}

// fields holds the rows of the fields table against a recount.
func (k claim) fields(rows []FieldTotal) {
	if rows == nil {
		return
	}
	j := k.c.j
	names := make([]string, len(j.sv.Fields))
	for i := range names {
		names[i] = j.sv.Fields[i].Name
	}
	have, starts := k.c.fieldGot(), k.c.starts()
	once(k, "fields", rows, func(r *FieldTotal) string { return r.Field }, names, func(r *FieldTotal, i int) {
		f, g, wanted := &j.sv.Fields[i], have[i], int64(j.wanted(i))
		row := k
		row.Field = f.Name
		if p := j.sv.Programs[f.Program].Name; r.Program != p {
			row.note(RuleName, 0, 0, "", fmt.Sprintf("field %s belongs to program %s, not to %s", f.Name, p, r.Program))
		}
		row.total("weight", r.Weight, j.weight(i), weightNear*(1+j.weight(i)), "")
		row.total("ra_deg", r.RA, degrees(f.RA), positionNear, "deg")
		row.total("dec_deg", r.Dec, degrees(f.Dec), positionNear, "deg")
		row.count("visits_wanted", r.VisitsWanted, wanted)
		row.count("visits_planned", r.VisitsPlanned, g.planned)
		row.count("visits_done", r.VisitsDone, g.done)
		coverage, bonus := 0.0, 0.0
		if wanted > 0 {
			coverage = g.quality / float64(wanted)
		}
		if g.planned+g.done == wanted {
			bonus = j.sv.FinishBonus
		}
		row.total("coverage", r.Coverage, coverage, ratioNear, "")
		row.total("bonus", r.Bonus, bonus, weightNear, "")
		var all []int64
		for _, list := range starts[i] {
			all = append(all, list...)
		}
		slices.Sort(all)
		row.times(r, all)
	})
}

// times holds the first and last visit and the longest gap.
func (k claim) times(r *FieldTotal, starts []int64) {
	var first, last int64
	longest := math.NaN()
	for i, s := range starts {
		if i == 0 {
			first = s
		} else if gap := float64(s-starts[i-1]) / dayMicro; !(gap <= longest) {
			longest = gap
		}
		last = s
	}
	k.count("first_utc", r.First, first)
	k.count("last_utc", r.Last, last)
	switch {
	case (r.LongestGap == nil) != math.IsNaN(longest):
		k.note(RuleTotal, 0, 0, "d", "longest_gap_d stands for two visits and more, and only then")
	case r.LongestGap != nil:
		k.total("longest_gap_d", *r.LongestGap, longest, 1e-9, "d")
	}
}

// demands holds the rows of the demands table against a recount.
func (k claim) demands(rows []DemandTotal) {
	if rows == nil {
		return
	}
	sv := k.c.j.sv
	var names []string
	type place struct{ field, demand int }
	var places []place
	for f := range sv.Fields {
		for d, demand := range sv.Programs[sv.Fields[f].Program].Demands {
			names = append(names, sv.Fields[f].Name+joint+demand.Name)
			places = append(places, place{f, d})
		}
	}
	done := map[place]int64{}
	for i := range k.c.visits {
		if v := &k.c.visits[i]; v.first().counts && v.done {
			done[place{v.first().field, v.first().demand}]++
		}
	}
	starts := k.c.starts()
	once(k, "demands", rows, func(r *DemandTotal) string { return r.Field + joint + r.Demand }, names, func(r *DemandTotal, i int) {
		p := places[i]
		d := &sv.Programs[sv.Fields[p.field].Program].Demands[p.demand]
		list := starts[p.field][p.demand]
		row := k
		row.Field = r.Field
		row.count("demand "+d.Name+": wanted", r.Wanted, int64(d.Visits))
		row.count("demand "+d.Name+": planned", r.Planned, int64(len(list))-done[p])
		row.count("demand "+d.Name+": done", r.Done, done[p])
		var wide int64
		for k := 1; k < len(list); k++ {
			if float64(list[k]-list[k-1])/1e6 > d.GapMax {
				wide++
			}
		}
		row.count("demand "+d.Name+": gap_max_breaches", r.GapMaxBreaches, wide)
	})
}

// nights holds the rows of the nights table against a recount.
func (k claim) nights(rows []NightTotal, h spent) {
	if rows == nil {
		return
	}
	j := k.c.j
	var names []string
	var want []*NightTotal
	key := func(r *NightTotal) string { return r.Telescope + joint + survey.Day(r.Night).String() }
	for t := range h.nights {
		for n := range h.nights[t] {
			r := &h.nights[t][n]
			names, want = append(names, key(r)), append(want, r)
		}
	}
	once(k, "nights", rows, key, names, func(r *NightTotal, i int) {
		w := want[i]
		row := k
		row.Telescope, row.Night = r.Telescope, survey.Day(r.Night).String()
		if r.Site != w.Site {
			row.note(RuleName, 0, 0, "", fmt.Sprintf("telescope %s is at site %s, not at %s", r.Telescope, w.Site, r.Site))
		}
		row.total("dark_hours", r.DarkHours, w.DarkHours, hoursNear, "h")
		row.total("open_hours", r.OpenHours, w.OpenHours, hoursNear, "h")
		row.total("used_hours", r.UsedHours, w.UsedHours, hoursNear, "h")
		row.total("exposure_hours", r.ExposureHours, w.ExposureHours, hoursNear, "h")
		row.count("visits", r.Visits, w.Visits)
		site := j.siteIDs[w.Site]
		in := &j.nights[site][r.Night-int32(j.sv.FirstNight)]
		lit := j.exact.Moon(j.sites[site], (in.from+in.to)/2).Illumination
		row.total("moon_illumination", r.MoonIllumination, lit, litNear, "")
	})
}
