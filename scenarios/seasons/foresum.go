package seasons

import (
	"cmp"
	"fmt"
	"slices"
	"strings"

	"nightwright/constraints/survey"
	"nightwright/scheduler/tables"
)

// ForecastTables is a forecast worked up from its parts.
type ForecastTables struct {
	Seasons []tables.SeasonRow
	Bands   []tables.BandRow
	Chances []tables.ChanceRow
	Summary ForecastSummary
}

// ForecastSummary is forecast.json.
type ForecastSummary struct {
	Kind     string          `json:"kind"`
	Run      string          `json:"run"`
	Seasons  int             `json:"seasons"`
	Policies []PolicySummary `json:"policies"`
}

// PolicySummary is what one policy reaches.
type PolicySummary struct {
	Policy         string   `json:"policy"`
	Coverage       Interval `json:"coverage"`
	P05            float64  `json:"coverage_p05"`
	P50            float64  `json:"coverage_p50"`
	P95            float64  `json:"coverage_p95"`
	VisitsGot      Interval `json:"visits_got"`
	FieldsFinished Interval `json:"fields_finished"`
	OpenHours      float64  `json:"open_hours"`
	LostHours      Interval `json:"lost_hours"`
	UsedHours      float64  `json:"used_hours"`
	WastedHours    float64  `json:"wasted_hours"`
	// Over the seasons that were planned with hindsight: coverage over that of
	// the plan that knew the weather, and over its ceiling. Null without any.
	HindsightSeasons int       `json:"hindsight_seasons"`
	OfHindsightPlan  *Interval `json:"of_hindsight_plan"`
	OfHindsightLimit *Interval `json:"of_hindsight_ceiling"`
}

// ForecastKind marks forecast.json.
const ForecastKind = "nightwright forecast"

// JoinForecast works up the rows of all parts of a forecast.
func JoinForecast(run string, rows []tables.PartRow) (*ForecastTables, error) {
	rows = slices.Clone(rows)
	tables.Parts.Sort(rows)
	b := newBoard(rows)
	out := &ForecastTables{Summary: ForecastSummary{Kind: ForecastKind, Run: run, Policies: []PolicySummary{}}}
	for _, cast := range b.casts {
		if cast == castHindsight {
			continue
		}
		coverage := b.list(cast, whatCoverage)
		out.Summary.Seasons = len(coverage)
		plan, limit := b.pairs(cast, castHindsight, whatCoverage), b.pairs(cast, castHindsight, whatCeiling)
		c := sorted(coverage)
		s := PolicySummary{
			Policy: cast, Coverage: MeanInterval(coverage), P05: Quantile(c, 0.05), P50: Quantile(c, 0.5), P95: Quantile(c, 0.95),
			VisitsGot: MeanInterval(b.list(cast, whatVisits)), FieldsFinished: MeanInterval(b.list(cast, whatFinished)),
			OpenHours: MeanInterval(b.list(cast, whatOpen)).Mean, LostHours: MeanInterval(b.list(cast, whatLost)),
			UsedHours: MeanInterval(b.list(cast, whatUsed)).Mean, WastedHours: MeanInterval(b.list(cast, whatWasted)).Mean,
			HindsightSeasons: len(plan[0]),
		}
		if len(plan[0]) > 0 {
			p, l := Ratio(plan[0], plan[1]), Ratio(limit[0], limit[1])
			s.OfHindsightPlan, s.OfHindsightLimit = &p, &l
		}
		out.Summary.Policies = append(out.Summary.Policies, s)
		out.seasons(b, cast)
		if err := out.bands(b, cast); err != nil {
			return nil, err
		}
		if err := out.chances(b, cast); err != nil {
			return nil, err
		}
	}
	tables.Seasons.Sort(out.Seasons)
	tables.Bands.Sort(out.Bands)
	tables.Chances.Sort(out.Chances)
	return out, nil
}

func (out *ForecastTables) seasons(b *board, cast string) {
	for _, k := range b.seasons {
		v := func(what string) float64 { x, _ := b.at(cast, what, "", k); return x }
		r := tables.SeasonRow{
			Policy: cast, Season: k, Coverage: v(whatCoverage), VisitsGot: int64(v(whatVisits)), FieldsFinished: int64(v(whatFinished)),
			OpenHours: v(whatOpen), LostHours: v(whatLost), UsedHours: v(whatUsed), WastedHours: v(whatWasted),
		}
		if x, ok := b.at(castHindsight, whatCoverage, "", k); ok {
			r.HindsightPlan = &x
		}
		if x, ok := b.at(castHindsight, whatCeiling, "", k); ok {
			r.HindsightLimit = &x
		}
		out.Seasons = append(out.Seasons, r)
	}
}

func (out *ForecastTables) bands(b *board, cast string) error {
	for _, night := range b.items(cast, whatNight) {
		x := sorted(b.of(cast, whatNight, night))
		day, err := survey.ParseDay(night)
		if err != nil {
			return fmt.Errorf("a part's night %w", err)
		}
		out.Bands = append(out.Bands, tables.BandRow{
			Policy: cast, Night: int32(day), Mean: MeanInterval(x).Mean,
			P05: Quantile(x, 0.05), P25: Quantile(x, 0.25), P50: Quantile(x, 0.5), P75: Quantile(x, 0.75), P95: Quantile(x, 0.95),
		})
	}
	return nil
}

func (out *ForecastTables) chances(b *board, cast string) error {
	for _, item := range b.items(cast, whatFieldBy) {
		at := strings.LastIndexByte(item, ' ')
		day, err := survey.ParseDay(item[at+1:])
		if err != nil || at < 0 {
			return fmt.Errorf("a part's item %q; want a field and a date", item)
		}
		sum := 0.0
		for _, x := range b.of(cast, whatFieldBy, item) {
			sum += x
		}
		out.Chances = append(out.Chances, tables.ChanceRow{Policy: cast, Field: item[:at], MonthEnd: int32(day), Chance: sum / float64(len(b.seasons))})
	}
	return nil
}

// board finds the numbers of parts.
type board struct {
	casts   []string
	seasons []int64
	rows    map[boardKey][]boardValue
	keys    map[[2]string][]string // items of a cast and what, in order
}

type boardKey struct{ cast, what, item string }

type boardValue struct {
	season int64
	value  float64
}

func newBoard(rows []tables.PartRow) *board {
	b := &board{rows: map[boardKey][]boardValue{}, keys: map[[2]string][]string{}}
	seen := map[int64]bool{}
	for i := range rows {
		r := &rows[i]
		k := boardKey{r.Cast, r.What, r.Item}
		if len(b.rows[k]) == 0 {
			at := [2]string{r.Cast, r.What}
			b.keys[at] = append(b.keys[at], r.Item)
		}
		b.rows[k] = append(b.rows[k], boardValue{r.Season, r.Value})
		if !slices.Contains(b.casts, r.Cast) {
			b.casts = append(b.casts, r.Cast)
		}
		if r.Season >= 0 && !seen[r.Season] {
			seen[r.Season] = true
			b.seasons = append(b.seasons, r.Season)
		}
	}
	slices.Sort(b.seasons)
	return b
}

// items lists the items of a cast and what, sorted.
func (b *board) items(cast, what string) []string {
	out := slices.Clone(b.keys[[2]string{cast, what}])
	slices.Sort(out)
	return out
}

// of returns the values of one item by season.
func (b *board) of(cast, what, item string) []float64 {
	v := b.rows[boardKey{cast, what, item}]
	out := make([]float64, len(v))
	for i := range v {
		out[i] = v[i].value
	}
	return out
}

// list is of without an item.
func (b *board) list(cast, what string) []float64 { return b.of(cast, what, "") }

func (b *board) at(cast, what, item string, season int64) (float64, bool) {
	v := b.rows[boardKey{cast, what, item}]
	k, ok := slices.BinarySearchFunc(v, season, func(x boardValue, s int64) int { return cmp.Compare(x.season, s) })
	if !ok {
		return 0, false
	}
	return v[k].value, true
}

// pairs returns a cast's coverage and another's number over the seasons that
// both have.
func (b *board) pairs(cast, other, what string) [2][]float64 {
	var out [2][]float64
	for _, k := range b.seasons {
		x, ok1 := b.at(cast, whatCoverage, "", k)
		y, ok2 := b.at(other, what, "", k)
		if ok1 && ok2 {
			out[0], out[1] = append(out[0], x), append(out[1], y)
		}
	}
	return out
}
