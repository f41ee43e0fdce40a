package tables

import "cmp"

// PartRow is one number of one shard of a forecast or a comparison; a part is
// a file of them. Seasons are numbered from 0; sums over a shard's seasons have
// season -1 and are whole numbers, what holds for all seasons has -2.
type PartRow struct {
	Run    string  `parquet:"run,dict"` // what was asked for: survey, plan, seed, seasons and so on
	Shard  int64   `parquet:"shard"`    // 1..Shards
	Shards int64   `parquet:"shards"`
	Season int64   `parquet:"season"`
	Cast   string  `parquet:"cast,dict"` // policy or network
	What   string  `parquet:"what,dict"`
	Item   string  `parquet:"item,dict"` // night, field, site or bin; "" for the season itself
	Value  float64 `parquet:"value"`
}

// SeasonRow is one simulated season under one policy.
type SeasonRow struct {
	Policy         string   `parquet:"policy,dict"`
	Season         int64    `parquet:"season"`
	Coverage       float64  `parquet:"coverage"`
	VisitsGot      int64    `parquet:"visits_got"`
	FieldsFinished int64    `parquet:"fields_finished"`
	OpenHours      float64  `parquet:"open_hours"`                 // telescope hours, under any sky
	LostHours      float64  `parquet:"lost_hours"`                 // of them under a closed sky
	UsedHours      float64  `parquet:"used_hours"`                 // exposures that count, and gaps
	WastedHours    float64  `parquet:"wasted_hours"`               // exposures that clouds broke off
	HindsightPlan  *float64 `parquet:"hindsight_plan,optional"`    // coverage of a plan that knew the weather
	HindsightLimit *float64 `parquet:"hindsight_ceiling,optional"` // proven ceiling with the weather known
}

// BandRow is the spread of coverage at the end of one night.
type BandRow struct {
	Policy string  `parquet:"policy,dict"`
	Night  int32   `parquet:"night,date"`
	Mean   float64 `parquet:"coverage_mean"`
	P05    float64 `parquet:"coverage_p05"`
	P25    float64 `parquet:"coverage_p25"`
	P50    float64 `parquet:"coverage_p50"`
	P75    float64 `parquet:"coverage_p75"`
	P95    float64 `parquet:"coverage_p95"`
}

// ChanceRow is the chance that a field has every visit by the end of a month.
type ChanceRow struct {
	Policy   string  `parquet:"policy,dict"`
	Field    string  `parquet:"field,dict"`
	MonthEnd int32   `parquet:"month_end,date"` // last day of the month, or the period's last night
	Chance   float64 `parquet:"finished_chance"`
}

// NetworkRow is one network of a comparison. Differences are from the first
// network that was listed, season by season.
type NetworkRow struct {
	Network        string  `parquet:"network,dict"`
	Sites          string  `parquet:"sites,dict"` // with "; " between
	Order          int64   `parquet:"listed"`     // place in the list, from 1
	Cost           float64 `parquet:"cost"`
	Coverage       float64 `parquet:"coverage_mean"`
	Low            float64 `parquet:"coverage_low"` // 95 % interval of the mean
	High           float64 `parquet:"coverage_high"`
	Difference     float64 `parquet:"difference_mean"`
	DifferenceLow  float64 `parquet:"difference_low"`
	DifferenceHigh float64 `parquet:"difference_high"`
	BestChance     float64 `parquet:"best_chance"` // share of seasons in which no other gets more; ties are shared
	PerCost        float64 `parquet:"coverage_per_cost"`
	DarkGap        float64 `parquet:"longest_dark_gap_h"`      // longest stretch in which no telescope is open, clouds apart
	Round          float64 `parquet:"round_the_clock"`         // share of the period in which one is
	WorstDown      string  `parquet:"worst_site_down,dict"`    // the site whose loss for a month costs most
	Redundancy     float64 `parquet:"left_when_worst_is_down"` // coverage then, over coverage
}

// PairRow is the difference of two networks under the same skies.
type PairRow struct {
	Network   string  `parquet:"network,dict"`
	Other     string  `parquet:"other,dict"`
	Mean      float64 `parquet:"difference_mean"` // network - other
	Low       float64 `parquet:"difference_low"`
	High      float64 `parquet:"difference_high"`
	WinChance float64 `parquet:"more_chance"` // share of seasons in which network gets more
}

// WorthRow is what one site adds.
type WorthRow struct {
	Site           string  `parquet:"site,dict"`
	Cost           float64 `parquet:"cost"`
	Marginal       float64 `parquet:"marginal_mean"` // coverage of all sites less that of all others
	MarginalLow    float64 `parquet:"marginal_low"`
	MarginalHigh   float64 `parquet:"marginal_high"`
	Shapley        float64 `parquet:"shapley_mean"` // its share of the coverage of all sites (Shapley 1953)
	ShapleyLow     float64 `parquet:"shapley_low"`
	ShapleyHigh    float64 `parquet:"shapley_high"`
	Alone          float64 `parquet:"alone_mean"` // coverage of this site alone
	ShapleyPerCost float64 `parquet:"shapley_per_cost"`
}

// StrengthRow is how much of a site's credit falls into a bin, beside that of
// all sites together.
type StrengthRow struct {
	Site     string  `parquet:"site,dict"`
	Kind     string  `parquet:"kind,dict"` // declination, month or moon
	Bin      string  `parquet:"bin,dict"`
	Share    float64 `parquet:"share"`         // of the site's credit
	Network  float64 `parquet:"network_share"` // of the credit of all sites
	Strength float64 `parquet:"strength"`      // share / network share; above 1 the site is good at it
}

// The tables of forecasts and comparisons.
var (
	Parts = Table[PartRow]{"part", []string{"cast", "season", "what", "item"}, func(a, b *PartRow) int {
		return cmp.Or(cmp.Compare(a.Cast, b.Cast), cmp.Compare(a.Season, b.Season), cmp.Compare(a.What, b.What), cmp.Compare(a.Item, b.Item))
	}}
	Seasons = Table[SeasonRow]{"seasons", []string{"policy", "season"}, func(a, b *SeasonRow) int {
		return cmp.Or(cmp.Compare(a.Policy, b.Policy), cmp.Compare(a.Season, b.Season))
	}}
	Bands = Table[BandRow]{"bands", []string{"policy", "night"}, func(a, b *BandRow) int {
		return cmp.Or(cmp.Compare(a.Policy, b.Policy), cmp.Compare(a.Night, b.Night))
	}}
	Chances = Table[ChanceRow]{"chances", []string{"policy", "field", "month_end"}, func(a, b *ChanceRow) int {
		return cmp.Or(cmp.Compare(a.Policy, b.Policy), cmp.Compare(a.Field, b.Field), cmp.Compare(a.MonthEnd, b.MonthEnd))
	}}
	Networks = Table[NetworkRow]{"networks", []string{"listed"}, func(a, b *NetworkRow) int { return cmp.Compare(a.Order, b.Order) }}
	Pairs    = Table[PairRow]{"pairs", []string{"network", "other"}, func(a, b *PairRow) int {
		return cmp.Or(cmp.Compare(a.Network, b.Network), cmp.Compare(a.Other, b.Other))
	}}
	Worths    = Table[WorthRow]{"worths", []string{"site"}, func(a, b *WorthRow) int { return cmp.Compare(a.Site, b.Site) }}
	Strengths = Table[StrengthRow]{"strengths", []string{"site", "kind", "bin"}, func(a, b *StrengthRow) int {
		return cmp.Or(cmp.Compare(a.Site, b.Site), cmp.Compare(a.Kind, b.Kind), cmp.Compare(a.Bin, b.Bin))
	}}
)
