package weather

import (
	"math"

	"nightwright/constraints/survey"
)

// Fit is what a record says of a site's weather.
type Fit struct {
	Rows    int     `json:"rows"`
	Gaps    int     `json:"gaps"`
	Missing int     `json:"missing"`
	Step    float64 `json:"step_s"`
	From    int64   `json:"from_unix_s"` // UTC, of the first row
	To      int64   `json:"to_unix_s"`

	Mean      float64     `json:"clear_mean"`     // open share of all rows
	Months    [12]float64 `json:"clear_by_month"` // open share by month; where there are no rows, between the neighbours
	MonthRows [12]int     `json:"rows_by_month"`

	OpenOpen   float64 `json:"open_after_open"`   // P(open | the row before was open)
	ClosedOpen float64 `json:"open_after_closed"` // P(open | the row before was closed)
	Lag1       float64 `json:"lag1"`              // OpenOpen - ClosedOpen, the chain's r

	// Season is the correlation of neighbours about their months' means: what
	// is left of r when the months take their part. The persistence goes with it.
	Season      float64 `json:"lag1_about_months"`
	Persistence float64 `json:"persistence_s"` // s

	OpenRuns                     Runs    `json:"open_runs"`
	ClosedRuns                   Runs    `json:"closed_runs"`
	Lags                         []Lag   `json:"lags"`
	SlowDecay                    bool    `json:"slow_decay"`      // the record remembers longer than the chain, beyond chance
	RunChi2                      float64 `json:"run_chi2"`        // open runs against geometric ones
	RunChi2P                     float64 `json:"run_chi2_chance"` // of a worse fit; -1: too few runs to say
	RunClasses                   int     `json:"run_classes"`
	HourlyPersistenceFromDailies bool    `json:"daily_rows"` // steps of half a day or more: hours are extrapolated
}

// Runs describes the runs of one state. Runs that touch a gap or an end of the
// record aren't whole and don't count.
type Runs struct {
	Count     int     `json:"count"`
	Mean      float64 `json:"mean"` // rows
	Longest   int     `json:"longest"`
	Geometric float64 `json:"mean_of_chain"` // mean of the chain, 1/(1 - P(stay))
}

// Lag is the autocorrelation at a distance of K rows.
type Lag struct {
	K      int     `json:"rows"`
	Record float64 `json:"record"`
	Chain  float64 `json:"chain"`       // Lag1^K: a chain of one clear fraction
	Months float64 `json:"with_months"` // a chain with the months' clear fractions and the persistence of Season
	Pairs  int     `json:"pairs"`
}

// lagsTold are the distances that are compared.
var lagsTold = []int{1, 2, 3, 5, 10, 30}

// FitRecord estimates the parameters of the two-state sky from a record and
// says how well such a chain describes it.
//
// P(open|open) and P(open|closed) are the maximum-likelihood estimates, the
// shares among neighbouring rows (Anderson & Goodman 1957); rows with a gap
// between them are no neighbours. The autocorrelation at lag k is the sample
// covariance of the pairs k steps apart over the sample variance.
func FitRecord(rec *Record) *Fit {
	s := rec.Samples
	f := &Fit{Rows: len(s), Gaps: rec.Gaps, Missing: rec.Missing, Step: float64(rec.Step), From: s[0].At, To: s[len(s)-1].At}
	f.HourlyPersistenceFromDailies = rec.Step >= 43200
	f.setShares(s)
	f.setTransitions(rec)
	for _, k := range lagsTold {
		f.Lags = append(f.Lags, f.lag(rec, k))
	}
	f.Season = math.Max(-1, math.Min(1, residual(rec, f.Months)))
	f.Persistence = Persistence(f.Season, f.Step)
	f.predict(rec)
	f.OpenRuns = runs(rec, true, f.OpenOpen)
	f.ClosedRuns = runs(rec, false, 1-f.ClosedOpen)
	f.testRuns(rec)
	return f
}

func monthOf(at int64) int { return survey.Day(floorDiv(at, 86400)).Month() }

func (f *Fit) setShares(s []Sample) {
	var open [12]int
	all := 0
	for _, x := range s {
		m := monthOf(x.At)
		f.MonthRows[m]++
		if x.Open {
			open[m]++
			all++
		}
	}
	f.Mean = float64(all) / float64(len(s))
	for m := range open {
		if f.MonthRows[m] > 0 {
			f.Months[m] = float64(open[m]) / float64(f.MonthRows[m])
		}
	}
	// A month without rows lies on the line between the nearest with some.
	for m := range f.Months {
		if f.MonthRows[m] > 0 {
			continue
		}
		a, b := 1, 1
		for f.MonthRows[(m-a+12)%12] == 0 {
			a++
		}
		for f.MonthRows[(m+b)%12] == 0 {
			b++
		}
		lo, hi := f.Months[(m-a+12)%12], f.Months[(m+b)%12]
		f.Months[m] = lo + (hi-lo)*float64(a)/float64(a+b)
	}
}

func (f *Fit) setTransitions(rec *Record) {
	var n, stay [2]int
	pairs(rec, 1, func(a, b Sample) {
		k := bit(a.Open)
		n[k]++
		stay[k] += bit(b.Open)
	})
	share := func(part, whole int, none float64) float64 {
		if whole == 0 {
			return none
		}
		return float64(part) / float64(whole)
	}
	f.OpenOpen = share(stay[1], n[1], f.Mean)
	f.ClosedOpen = share(stay[0], n[0], f.Mean)
	f.Lag1 = f.OpenOpen - f.ClosedOpen
}

func bit(b bool) int {
	if b {
		return 1
	}
	return 0
}

// pairs calls f for all samples k steps apart. Samples are ascending.
func pairs(rec *Record, k int, f func(a, b Sample)) {
	s := rec.Samples
	want, j := int64(k)*rec.Step, 0
	for i := range s {
		for j < len(s) && s[j].At < s[i].At+want {
			j++
		}
		if j < len(s) && s[j].At == s[i].At+want {
			f(s[i], s[j])
		}
	}
}

func (f *Fit) lag(rec *Record, k int) Lag {
	l := Lag{K: k, Chain: math.Pow(f.Lag1, float64(k))}
	sum := 0.0
	pairs(rec, k, func(a, b Sample) {
		sum += (float64(bit(a.Open)) - f.Mean) * (float64(bit(b.Open)) - f.Mean)
		l.Pairs++
	})
	if v := f.Mean * (1 - f.Mean); v > 0 && l.Pairs > 0 {
		l.Record = sum / float64(l.Pairs) / v
	}
	return l
}

// residual is the correlation of neighbours about their months' means.
func residual(rec *Record, months [12]float64) float64 {
	num, den := 0.0, 0.0
	pairs(rec, 1, func(a, b Sample) {
		p, q := months[monthOf(a.At)], months[monthOf(b.At)]
		num += (float64(bit(a.Open)) - p) * (float64(bit(b.Open)) - q)
		den += math.Sqrt(p * (1 - p) * q * (1 - q))
	})
	if den == 0 {
		return 0
	}
	return num / den
}

// predict fills what a chain with the months' shares would show: the
// covariance of the shares themselves plus r^k of what is left of the variance.
func (f *Fit) predict(rec *Record) {
	v := f.Mean * (1 - f.Mean)
	for i := range f.Lags {
		l := &f.Lags[i]
		if v == 0 || l.Pairs == 0 {
			continue
		}
		between, within := 0.0, 0.0
		pairs(rec, l.K, func(a, b Sample) {
			p, q := f.Months[monthOf(a.At)], f.Months[monthOf(b.At)]
			between += (p - f.Mean) * (q - f.Mean)
			within += math.Sqrt(p * (1 - p) * q * (1 - q))
		})
		n := float64(l.Pairs)
		l.Months = (between + math.Pow(math.Max(0, f.Season), float64(l.K))*within) / n / v
		// Three standard errors of a correlation of about 0 in n pairs
		// (Bartlett 1946: 1/sqrt(n)).
		if l.K > 1 && l.Record-l.Chain > 3/math.Sqrt(n) {
			f.SlowDecay = true
		}
	}
}
