package tables

import (
	"nightwright/constraints"
	"nightwright/scheduler/model"
)

// summary sums up the rows, which must be complete; checksums come later.
func (b *builder) summary(pt *PlanTables) Summary {
	sv := b.sv
	s := Summary{
		SchemaVersion: SchemaVersion, Kind: SummaryKind, Survey: sv.Name,
		FirstNight: sv.FirstNight.String(), LastNight: sv.LastNight.String(),
		Seed: b.out.Seed, Effort: b.out.Effort, Status: b.out.Status.String(),
		Score: b.tally.score(nil), Ceiling: b.out.Ceiling, Expected: b.out.Expected,
		Programs: b.programs(), Search: []Counter{}, Files: []FileSum{}, Tables: []TableSum{},
	}
	// A recount over the ceiling by rounding alone is no gap below 0.
	s.Gap = max(0, model.Gap(s.Coverage, s.Ceiling))
	for _, c := range b.out.Stats {
		s.Search = append(s.Search, Counter{c.Name, c.Value})
	}
	for _, p := range b.out.Parts {
		s.GapParts = append(s.GapParts, GapPart{p.Name, p.Worth})
	}
	s.Sites = make([]SiteSummary, len(sv.Sites))
	s.Telescopes = make([]TelescopeSummary, len(sv.Telescopes))
	nights := sv.Nights()
	for t := range sv.Telescopes {
		site := &s.Sites[sv.Telescopes[t].Site]
		tel := &s.Telescopes[t]
		site.Site = sv.Sites[sv.Telescopes[t].Site].Name
		tel.Telescope, tel.Site = sv.Telescopes[t].Name, site.Site
		for n := range nights {
			r := &pt.Nights[t*nights+n]
			s.Hours.add(r)
			site.Hours.add(r)
			tel.Hours.add(r)
			site.Visits += r.Visits
			tel.Visits += r.Visits
		}
	}
	for i := range sv.Sites { // one without telescopes
		s.Sites[i].Site = sv.Sites[i].Name
	}
	return s
}

func (b *builder) programs() []ProgramSummary {
	sv := b.sv
	own, all := make([]float64, len(sv.Programs)), 0.0
	for i := range b.shots {
		x := &b.shots[i]
		if x.Night < 0 || int(x.Night) >= sv.Nights() { // shares are of the period's time
			continue
		}
		sec := float64(x.End-x.Start) / 1e6
		own[sv.Fields[x.Field].Program] += sec
		all += sec
	}
	out := make([]ProgramSummary, len(sv.Programs))
	for i := range sv.Programs {
		p := &sv.Programs[i]
		out[i] = ProgramSummary{
			Program: p.Name, Weight: p.Weight,
			Score:         b.tally.score(func(f int) bool { return sv.Fields[f].Program == i }),
			ExposureHours: own[i] / 3600, Share: constraints.Share(own[i], all), ShareMin: p.ShareMin, ShareMax: p.ShareMax,
		}
	}
	for _, o := range b.out.Shares {
		out[o.Program].ShareBreach, out[o.Program].ShareWhy = o.Breach, o.Why
	}
	return out
}
