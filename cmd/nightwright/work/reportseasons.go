package work

import (
	"cmp"
	"encoding/json"
	"fmt"
	"math"
	"os"
	"path/filepath"
	"slices"
	"strings"

	"nightwright/cmd/nightwright/draw"
	"nightwright/cmd/nightwright/report"
	"nightwright/scenarios/seasons"
	"nightwright/scheduler/tables"
)

// nearby fills in the folders of a forecast and a comparison that stand
// beside a plan and are of it. It returns what stood there and is not.
func nearby(plan string, ask *ReportAsk, s *Survey, pt *tables.PlanTables) []string {
	left := []string{}
	if !ask.Beside {
		return left
	}
	near := filepath.Dir(filepath.Clean(plan))
	if dir := filepath.Join(near, "forecast"); ask.Forecast == "" && isFile(filepath.Join(dir, "forecast.json")) {
		if _, err := s.forecastOf(dir, pt); err != nil {
			left = append(left, "left out: "+strings.TrimPrefix(err.Error(), "nightwright: "))
		} else {
			ask.Forecast = dir
		}
	}
	if dir := filepath.Join(near, "comparison"); ask.Compare == "" && isFile(filepath.Join(dir, "compare.json")) {
		if err := s.comparisonOf(dir, &report.Input{}); err != nil {
			left = append(left, "left out: "+strings.TrimPrefix(err.Error(), "nightwright: "))
		} else {
			ask.Compare = dir
		}
	}
	return left
}

func isFile(path string) bool {
	info, err := os.Stat(path)
	return err == nil && info.Mode().IsRegular()
}

// readSeasons reads the summary of simulated seasons and refuses one that was
// asked for something else: each of the words must stand in its run.
func readSeasons(dir, name string, into any, run func() string, words ...string) error {
	text, err := os.ReadFile(filepath.Join(dir, name))
	if err != nil {
		return Inputf("%v; want a folder as 'nightwright forecast' or 'nightwright compare' writes it", err)
	}
	if err := json.Unmarshal(text, into); err != nil {
		return Inputf("%s: %v; want it as it was written", filepath.Join(dir, name), err)
	}
	have := strings.Split(run(), "; ")
	for _, w := range words {
		if !slices.Contains(have, w) {
			return Inputf("%s is of another plan or survey (it has no %q); run it again", dir, w)
		}
	}
	return nil
}

// readSeasonRows reads a table of a folder.
func readSeasonRows[T any](t tables.Table[T], dir string) ([]T, error) {
	path := filepath.Join(dir, t.Name+".parquet")
	data, err := os.ReadFile(path)
	if err != nil {
		return nil, Inputf("%v; want the folder as it was written", err)
	}
	rows, err := t.Decode(path, data)
	if err != nil {
		return nil, &InputError{What: err.Error()}
	}
	return rows, nil
}

// forecastOf reads a forecast of a plan.
func (s *Survey) forecastOf(dir string, pt *tables.PlanTables) (*report.Forecast, error) {
	sum, err := planSum(pt)
	if err != nil {
		return nil, err
	}
	var m seasons.ForecastSummary
	if err := readSeasons(dir, "forecast.json", &m, func() string { return m.Run }, "forecast", "plan="+sum[:16]); err != nil {
		return nil, err
	}
	bands, err := readSeasonRows(tables.Bands, dir)
	if err != nil {
		return nil, err
	}
	chances, err := readSeasonRows(tables.Chances, dir)
	if err != nil {
		return nil, err
	}
	f := &report.Forecast{Seasons: m.Seasons, Promised: pt.Summary.Coverage}
	for _, p := range m.Policies {
		f.Ways = append(f.Ways, report.Way{Name: p.Policy, Mean: p.Coverage.Mean, Low: p.Coverage.Low, High: p.Coverage.High, P05: p.P05, P95: p.P95, FieldsFinished: p.FieldsFinished.Mean})
	}
	slices.SortStableFunc(f.Ways, func(a, b report.Way) int { return cmp.Compare(b.Mean, a.Mean) })
	if len(f.Ways) == 0 {
		return nil, Inputf("%s: the forecast has no way of acting; run it again", dir)
	}
	best := f.Ways[0].Name
	b := &draw.Band{Text: fmt.Sprintf("nine of ten simulated seasons, acting %s", best)}
	for i := range bands {
		if r := &bands[i]; r.Policy == best {
			b.T = append(b.T, float64(r.Night+1)*86400+43200) // at the end of the night's label
			b.Low, b.High, b.Middle = append(b.Low, r.P05), append(b.High, r.P95), append(b.Middle, r.P50)
		}
	}
	f.Band = b
	last := int32(math.MinInt32)
	for i := range chances {
		last = max(last, chances[i].MonthEnd)
	}
	for i := range chances {
		if r := &chances[i]; r.Policy == best && r.MonthEnd == last {
			f.Finish = append(f.Finish, report.ChanceRow{Field: r.Field, Chance: r.Chance})
			if r.Chance >= 0.5 {
				f.Likely++
			}
		}
	}
	slices.SortStableFunc(f.Finish, func(a, b report.ChanceRow) int { return cmp.Compare(a.Chance, b.Chance) })
	return f, nil
}

// comparisonOf reads a comparison of networks of this survey.
func (s *Survey) comparisonOf(dir string, in *report.Input) error {
	var m seasons.CompareSummary
	if err := readSeasons(dir, "compare.json", &m, func() string { return m.Run }, "survey="+s.Name, "files="+s.sum()[:16]); err != nil {
		return err
	}
	networks, err := readSeasonRows(tables.Networks, dir)
	if err != nil {
		return err
	}
	worths, err := readSeasonRows(tables.Worths, dir)
	if err != nil {
		return err
	}
	in.Seasons = m.Seasons
	for i := range networks {
		n := &networks[i]
		note := "the first: others are compared with it"
		if i > 0 {
			note = fmt.Sprintf("%+.4f (%+.4f to %+.4f), best in %.0f %%", n.Difference, n.DifferenceLow, n.DifferenceHigh, 100*n.BestChance)
		}
		in.Networks = append(in.Networks, report.Network{Name: n.Network, Sites: n.Sites, Mean: n.Coverage, Low: n.Low, High: n.High, Note: note, Base: i == 0})
	}
	for i := range worths {
		w := &worths[i]
		in.Worths = append(in.Worths, report.Worth{Site: w.Site, Alone: w.Alone, Adds: w.Marginal, AddsLow: w.MarginalLow, AddsHigh: w.MarginalHigh, Share: w.Shapley, ShareLow: w.ShapleyLow, ShareHigh: w.ShapleyHigh})
	}
	return nil
}
