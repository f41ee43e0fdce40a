package audit

import (
	"math"
	"slices"
	"testing"

	"nightwright/constraints/survey"
)

// claims is what the fixture's plan may claim of itself, worked out here from
// its rows by the formulas of the contract. Open and dark hours are the
// judge's, which TestNightsAgree holds against the almanac.
func (f *fixture) claims(t testing.TB) *Totals {
	t.Helper()
	j := f.judge(t)
	all := &Totals{Ceiling: 0.9}
	sv := f.sv
	weight, earned := 0.0, 0.0
	programs := make([]struct{ weight, earned, exposure float64 }, len(sv.Programs))
	all.Programs = make([]ProgramTotal, len(sv.Programs))
	for i := range sv.Fields {
		x := &sv.Fields[i]
		row := FieldTotal{Field: x.Name, Program: sv.Programs[x.Program].Name, Weight: sv.WeightOf(x), RA: x.RA / deg, Dec: x.Dec / deg, VisitsWanted: int64(sv.Wanted(x))}
		var all4 []int64
		for _, d := range sv.Programs[x.Program].Demands {
			dr := DemandTotal{Field: x.Name, Demand: d.Name, Wanted: int64(d.Visits)}
			var starts []int64
			for _, v := range f.visits {
				if v.Field != x.Name || v.Demand != d.Name {
					continue
				}
				row.Coverage += v.Quality / float64(len(d.Exposures)) / float64(sv.Wanted(x))
				if !slices.ContainsFunc(f.visits, func(o Visit) bool { return v.Set != 0 && o.Set == v.Set && o.Start < v.Start }) {
					starts = append(starts, v.Start)
				}
			}
			slices.Sort(starts)
			for k := 1; k < len(starts); k++ {
				if float64(starts[k]-starts[k-1]) > d.GapMax*1e6 {
					dr.GapMaxBreaches++
				}
			}
			dr.Planned = int64(len(starts))
			row.VisitsPlanned += dr.Planned
			all4 = append(all4, starts...)
			all.Demands = append(all.Demands, dr)
		}
		slices.Sort(all4)
		if n := len(all4); n > 0 {
			row.First, row.Last = all4[0], all4[n-1]
		}
		for k := 1; k < len(all4); k++ {
			gap := float64(all4[k]-all4[k-1]) / 86400e6
			if row.LongestGap == nil || gap > *row.LongestGap {
				row.LongestGap = &gap
			}
		}
		sum := row.Coverage
		got := Score{VisitsGot: row.VisitsPlanned, VisitsWanted: row.VisitsWanted, FieldsWanted: 1}
		if row.VisitsPlanned == row.VisitsWanted {
			row.Bonus = sv.FinishBonus
			got.FieldsFinished = 1
			sum += row.Bonus
		}
		all.Fields = append(all.Fields, row)
		for _, s := range []*Score{&all.Score, &all.Programs[x.Program].Score} {
			s.VisitsGot += got.VisitsGot
			s.VisitsWanted += got.VisitsWanted
			s.FieldsWanted++
			s.FieldsFinished += got.FieldsFinished
		}
		weight += sv.WeightOf(x)
		earned += sv.WeightOf(x) * sum
		programs[x.Program].weight += sv.WeightOf(x)
		programs[x.Program].earned += sv.WeightOf(x) * sum
	}
	all.Coverage = earned / weight / (1 + sv.FinishBonus)
	all.Gap = (all.Ceiling - all.Coverage) / all.Ceiling
	total := 0.0
	for _, v := range f.visits {
		programs[slices.IndexFunc(sv.Programs, func(p survey.Program) bool { return p.Name == v.Program })].exposure += v.Exposure / 3600
		total += v.Exposure / 3600
	}
	for i := range programs {
		p := &all.Programs[i]
		p.Program, p.ExposureHours, p.Share = sv.Programs[i].Name, programs[i].exposure, programs[i].exposure/total
		p.Coverage = programs[i].earned / programs[i].weight / (1 + sv.FinishBonus)
	}
	f.claimHours(j, all)
	return all
}

// claimHours adds the rows of nights and the sums of telescopes and sites.
func (f *fixture) claimHours(j *Judge, all *Totals) {
	sv := f.sv
	for i := range sv.Sites {
		all.Sites = append(all.Sites, PlaceTotal{Name: sv.Sites[i].Name})
	}
	for s := range sv.Telescopes {
		tel := PlaceTotal{Name: sv.Telescopes[s].Name}
		site := &all.Sites[sv.Telescopes[s].Site]
		for n := range sv.Nights() {
			in := &j.nights[sv.Telescopes[s].Site][n]
			row := NightTotal{
				Site: site.Name, Telescope: tel.Name, Night: int32(sv.FirstNight) + int32(n), DarkHours: in.dark / 3600, OpenHours: j.open[s][n].seconds / 3600,
				MoonIllumination: j.exact.Moon(j.sites[sv.Telescopes[s].Site], (in.from+in.to)/2).Illumination,
			}
			sets := map[int64]bool{}
			for _, v := range f.visits {
				if v.Telescope != tel.Name || v.Night != row.Night {
					continue
				}
				row.ExposureHours += v.Exposure / 3600
				row.UsedHours += (v.Exposure + v.GapBefore) / 3600
				if v.Set == 0 || !sets[v.Set] {
					row.Visits++
				}
				sets[v.Set] = true
			}
			all.Nights = append(all.Nights, row)
			for _, h := range []*Hours{&tel.Hours, &site.Hours, &all.Hours} {
				h.Dark += row.DarkHours
				h.Open += row.OpenHours
				h.Used += row.UsedHours
				h.Exposure += row.ExposureHours
			}
			tel.Visits += row.Visits
			site.Visits += row.Visits
		}
		all.Telescopes = append(all.Telescopes, tel)
	}
}

func (f *fixture) checkTotals(t *testing.T, totals *Totals) []Breach {
	t.Helper()
	r, err := f.judge(t).Check(t.Context(), Plan{Visits: f.visits, Totals: totals})
	if err != nil {
		t.Fatal(err)
	}
	return r.Breaches
}

func TestTrueTotalsPass(t *testing.T) {
	f := makeFixture(t)
	for _, b := range f.checkTotals(t, f.claims(t)) {
		t.Errorf("%+v", b)
	}
	all := f.claims(t)
	if n := len(all.Nights); n != 9 || all.Demands[0].GapMaxBreaches != 1 || all.Fields[0].LongestGap == nil {
		t.Errorf("the fixture shows too little: %+v", all)
	}
}

// TestEachTotalIsChecked changes one total at a time.
func TestEachTotalIsChecked(t *testing.T) {
	day := 1.0
	tests := []struct {
		name, rule string
		do         func(x *Totals)
	}{
		{"coverage", RuleTotal, func(x *Totals) { x.Coverage += 1e-8 }},
		{"coverage NaN", RuleTotal, func(x *Totals) { x.Coverage = math.NaN() }},
		{"visits got", RuleTotal, func(x *Totals) { x.VisitsGot++ }},
		{"visits wanted", RuleTotal, func(x *Totals) { x.VisitsWanted-- }},
		{"fields finished", RuleTotal, func(x *Totals) { x.FieldsFinished++ }},
		{"fields wanted", RuleTotal, func(x *Totals) { x.FieldsWanted++ }},
		{"gap", RuleTotal, func(x *Totals) { x.Gap *= 1.001 }},
		{"ceiling", RuleCeiling, func(x *Totals) { x.Ceiling, x.Gap = x.Coverage-1e-9, 0 }},
		{"hours", RuleTotal, func(x *Totals) { x.Hours.Open += 0.01 }},
		{"program's coverage", RuleTotal, func(x *Totals) { x.Programs[1].Coverage -= 1e-8 }},
		{"program's hours", RuleTotal, func(x *Totals) { x.Programs[1].ExposureHours += 1e-3 }},
		{"program's share", RuleTotal, func(x *Totals) { x.Programs[0].Share += 1e-5 }},
		{"share breach", RuleShare, func(x *Totals) { x.Programs[0].ShareBreach = 0.1 }},
		{"program unknown", RuleName, func(x *Totals) { x.Programs = append(x.Programs, ProgramTotal{Program: "wider"}) }},
		{"program missing", RuleName, func(x *Totals) { x.Programs = x.Programs[1:] }},
		{"program twice", RuleName, func(x *Totals) { x.Programs = append(x.Programs, x.Programs[0]) }},
		{"site's visits", RuleTotal, func(x *Totals) { x.Sites[0].Visits++ }},
		{"telescope's hours", RuleTotal, func(x *Totals) { x.Telescopes[2].Hours.Used -= 0.001 }},
		{"field's program", RuleName, func(x *Totals) { x.Fields[0].Program = "pairs" }},
		{"field's weight", RuleTotal, func(x *Totals) { x.Fields[0].Weight *= 1.0001 }},
		{"field's place", RuleTotal, func(x *Totals) { x.Fields[0].Dec += 1e-6 }},
		{"field's wanted", RuleTotal, func(x *Totals) { x.Fields[0].VisitsWanted++ }},
		{"field's planned", RuleTotal, func(x *Totals) { x.Fields[0].VisitsPlanned++ }},
		{"field's done", RuleTotal, func(x *Totals) { x.Fields[0].VisitsDone++ }},
		{"field's coverage", RuleTotal, func(x *Totals) { x.Fields[0].Coverage += 1e-5 }},
		{"field's bonus", RuleTotal, func(x *Totals) { x.Fields[0].Bonus = 0.2 }},
		{"field's first", RuleTotal, func(x *Totals) { x.Fields[0].First++ }},
		{"field's last", RuleTotal, func(x *Totals) { x.Fields[4].Last-- }},
		{"field's longest gap", RuleTotal, func(x *Totals) { *x.Fields[0].LongestGap += 1e-6 }},
		{"field's gap of one visit", RuleTotal, func(x *Totals) { x.Fields[5].LongestGap = &day }},
		{"field's gap missing", RuleTotal, func(x *Totals) { x.Fields[0].LongestGap = nil }},
		{"demand's wanted", RuleTotal, func(x *Totals) { x.Demands[3].Wanted++ }},
		{"demand's planned", RuleTotal, func(x *Totals) { x.Demands[3].Planned++ }},
		{"demand's done", RuleTotal, func(x *Totals) { x.Demands[3].Done++ }},
		{"demand's wishes", RuleTotal, func(x *Totals) { x.Demands[0].GapMaxBreaches = 0 }},
		{"demand missing", RuleName, func(x *Totals) { x.Demands = x.Demands[:4] }},
		{"night's site", RuleName, func(x *Totals) { x.Nights[0].Site = "Salt Mesa" }},
		{"night's dark", RuleTotal, func(x *Totals) { x.Nights[0].DarkHours += 1e-4 }},
		{"night's open", RuleTotal, func(x *Totals) { x.Nights[0].OpenHours += 1e-4 }},
		{"night's used", RuleTotal, func(x *Totals) { x.Nights[0].UsedHours += 1e-4 }},
		{"night's exposure", RuleTotal, func(x *Totals) { x.Nights[0].ExposureHours += 1e-4 }},
		{"night's visits", RuleTotal, func(x *Totals) { x.Nights[0].Visits-- }},
		{"night's Moon", RuleTotal, func(x *Totals) { x.Nights[0].MoonIllumination += 0.01 }},
		{"night outside", RuleName, func(x *Totals) { x.Nights = append(x.Nights, NightTotal{Telescope: "L1", Night: 1}) }},
	}
	f := makeFixture(t)
	for _, tt := range tests {
		x := f.claims(t)
		tt.do(x)
		b := f.checkTotals(t, x)
		if len(b) == 0 || slices.ContainsFunc(b, func(b Breach) bool { return b.Rule != tt.rule }) {
			t.Errorf("%s: %+v", tt.name, b)
		}
		// Several rows may miss what one truncated list lost; else it is one.
		if len(b) > 1 && tt.name != "demand missing" {
			t.Errorf("%s: %d breaches: %+v", tt.name, len(b), b)
		}
	}
}

// TestShares holds the judge's reading of a bound against cases worked by
// hand: own and all time 40 of 100, visits of 5.
func TestShares(t *testing.T) {
	tests := []struct {
		min, max, told float64
		breach         bool
	}{
		{0, 1, 0, false},
		{0.4, 0.4, 0, false},
		{0.3, 0.5, 0.05, true},   // told where there is none
		{0.42, 1, 0, false},      // 45 of 105 is within one visit
		{0.42, 1, 0.02, false},   // or told as it is
		{0.42, 1, 0.04, true},    // or told wrongly
		{0.44, 1, 0, false},      // 45 of 100: the visit takes another's place
		{0.46, 1, 0, true},       // out of reach by one visit
		{0.46, 1, 0.06, false},   // and told
		{0.46, 1, -0.06, false},  // with either sign
		{0, 0.38, 0, false},      // 35 of 95 or of 100
		{0, 0.34, 0, true},       // more than one visit too many
		{0, 0.34, 0.06, false},   // told
		{0, 0.34, 0.0601, true},  // told wrongly
		{0.4000001, 1, 0, false}, // numerics
		{0, 0.3999999, 0, false}, // numerics
		{0, 1, math.NaN(), true},
	}
	for _, tt := range tests {
		c := &trial{}
		claim{c: c}.share(&survey.Program{Name: "p", ShareMin: tt.min, ShareMax: tt.max}, tt.told, 40, 100, 5)
		if (len(c.breaches) > 0) != tt.breach {
			t.Errorf("%v: %v", tt, c.breaches)
		}
	}
}

func TestScoreByHand(t *testing.T) {
	f := makeFixture(t)
	r := f.check(t)
	sum := 0.0
	for _, v := range f.visits {
		sum += v.Credit
	}
	// S1 alone has both its sets: w b / ((1+b) W), weights 4 x 1 and 2 x 2.
	want := sum + 2*0.2/(1.2*8)
	if math.Abs(want-r.Score.Coverage) > 1e-12 || r.Score.FieldsFinished != 1 {
		t.Errorf("credits and bonus add up to %v, %+v", want, r.Score)
	}
}
