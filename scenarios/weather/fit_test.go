package weather

import (
	"fmt"
	"math"
	"os"
	"path/filepath"
	"strings"
	"testing"
	"time"
)

// record opens a data file of the npm package vega-datasets, pinned in
// .ci/node: daily weather of two cities, 2012 to 2015 (NOAA, public domain).
func record(t *testing.T, cols Columns) *Record {
	t.Helper()
	folder := os.Getenv("NIGHTWRIGHT_NODE")
	if folder == "" {
		folder = filepath.Join("..", "..", ".ci", "node")
	}
	f, err := os.Open(filepath.Join(folder, "node_modules", "vega-datasets", "data", "weather.csv"))
	if err != nil {
		if os.Getenv("NIGHTWRIGHT_REQUIRE_ALL") == "1" {
			t.Fatalf("vega-datasets is not installed, and NIGHTWRIGHT_REQUIRE_ALL is 1: %v", err)
		}
		t.Skip("vega-datasets is not installed: run npm ci in .ci/node")
	}
	defer f.Close()
	rec, err := Read("weather.csv", f, cols)
	if err != nil {
		t.Fatal(err)
	}
	return rec
}

// TestFitAgainstRealRecords: means, transitions, runs and correlations of
// vega-datasets 3.2.1, data/weather.csv, counted independently of this program
// (python3, pandas-free loops; 1 December 2026), to their last digit.
func TestFitAgainstRealRecords(t *testing.T) {
	tests := []struct {
		city, open                   string
		mean, oo, co, lag1, run, geo float64
		longest                      int
		lags                         [6]float64
		january, july                float64
		slow                         bool
	}{
		{"Seattle", "precipitation=0", 0.5736, 0.7563, 0.3274, 0.4288, 4.088, 4.103, 48, [6]float64{0.429, 0.293, 0.223, 0.154, 0.107, 0.106}, 0.47, 0.91, true},
		{"Seattle", "weather=sun", 0.4381, 0.6823, 0.2485, 0.4338, 3.137, 3.148, 18, [6]float64{0.434, 0.307, 0.256, 0.194, 0.164, 0.135}, 0.23, 0.73, true},
		{"New York", "precipitation<=0", 0.6783, 0.7326, 0.5650, 0.1676, 3.740, 3.740, 18, [6]float64{0.167, -0.052, -0.001, -0.018, -0.005, -0.008}, 0.65, 0.68, false},
		{"New York", "weather=sun", 0.5654, 0.6683, 0.4322, 0.2361, 3.015, 3.015, 15, [6]float64{0.236, 0.022, 0.006, 0.019, 0.012, 0.054}, 0.59, 0.56, false},
	}
	for _, tt := range tests {
		rec := record(t, Columns{Open: tt.open, Where: "location=" + tt.city})
		f := FitRecord(rec)
		near := func(what string, got, want, tol float64) {
			t.Helper()
			if !(math.Abs(got-want) <= tol) {
				t.Errorf("%s %s: %s is %.4f; want %.4f", tt.city, tt.open, what, got, want)
			}
		}
		if f.Rows != 1461 || f.Gaps != 0 || rec.Step != 86400 || rec.Other != 1461 {
			t.Errorf("%s: %d rows, %d gaps, step %d s, %d others", tt.city, f.Rows, f.Gaps, rec.Step, rec.Other)
		}
		near("mean", f.Mean, tt.mean, 5.1e-5)
		near("P(1|1)", f.OpenOpen, tt.oo, 5.1e-5)
		near("P(1|0)", f.ClosedOpen, tt.co, 5.1e-5)
		near("lag-1 r", f.Lag1, tt.lag1, 1.01e-4)
		// Runs at the ends of the record don't count here, and do there.
		near("mean run", f.OpenRuns.Mean, tt.run, 0.03)
		near("geometric run", f.OpenRuns.Geometric, tt.geo, 1e-3)
		if f.OpenRuns.Longest != tt.longest {
			t.Errorf("%s: longest run %d; want %d", tt.city, f.OpenRuns.Longest, tt.longest)
		}
		for i, want := range tt.lags {
			near(fmt.Sprintf("lag %d", f.Lags[i].K), f.Lags[i].Record, want, 2.5e-3)
		}
		near("January", f.Months[0], tt.january, 5.1e-3)
		near("July", f.Months[6], tt.july, 5.1e-3)
		// The chain's own consistency: p = P01/(1 - P11 + P01).
		near("stationary share", f.ClosedOpen/(1-f.OpenOpen+f.ClosedOpen), f.Mean, 1e-3)
		if f.SlowDecay != tt.slow {
			t.Errorf("%s %s: slow decay %v; want %v", tt.city, tt.open, f.SlowDecay, tt.slow)
		}
	}
}

// TestChainFallsShortInSeattle shows where a two-state chain of one clear
// fraction can't follow: at lag 5 and beyond the record remembers the season.
// With the months' fractions the chain does.
func TestChainFallsShortInSeattle(t *testing.T) {
	f := FitRecord(record(t, Columns{Open: "precipitation=0", Where: "location=Seattle"}))
	for _, l := range f.Lags {
		if l.K < 5 {
			continue
		}
		if l.Record < l.Chain+0.08 {
			t.Errorf("lag %d: record %.3f, chain %.3f; the season should show", l.K, l.Record, l.Chain)
		}
		if math.Abs(l.Months-l.Record) > 0.06 {
			t.Errorf("lag %d: record %.3f, chain with months %.3f", l.K, l.Record, l.Months)
		}
	}
	if f.Season >= f.Lag1 {
		t.Errorf("about the months r is %.3f, plain %.3f; want less", f.Season, f.Lag1)
	}
	// In New York it is gone at lag 2: less than the chain's r^2, if anything.
	n := FitRecord(record(t, Columns{Open: "precipitation=0", Where: "location=New York"}))
	if l := n.Lags[1]; l.Record > l.Chain {
		t.Errorf("New York, lag 2: record %.3f, chain %.3f", l.Record, l.Chain)
	}
}

// TestFitFindsWhatWasDrawn draws a record from the chain and fits it.
func TestFitFindsWhatWasDrawn(t *testing.T) {
	c := Climate{Site: "A", Persistence: 14 * 3600, Clear: [12]float64{0.62, 0.6, 0.65, 0.7, 0.72, 0.7, 0.5, 0.48, 0.6, 0.7, 0.68, 0.63}}
	const hours = 24 * 365 * 8
	s := NewSky([]Climate{c}, first, hours)
	s.Draw(1, 1)
	rec := &Record{Step: 3600}
	for k := range int64(hours) {
		rec.Samples = append(rec.Samples, Sample{(first + k) * 3600, s.Open(0, first+k)})
	}
	f := FitRecord(rec)
	if math.Abs(f.Persistence/3600-14) > 1.5 {
		t.Errorf("persistence %.2f h; want 14", f.Persistence/3600)
	}
	for m, want := range c.Clear {
		if math.Abs(f.Months[m]-want) > 0.1 {
			t.Errorf("month %d: %.3f; want %.3f", m+1, f.Months[m], want)
		}
	}
	if f.RunChi2P < 0.001 {
		t.Errorf("the runs of a drawn chain are refused: chi2 %.1f of %d classes, P %.5f", f.RunChi2, f.RunClasses, f.RunChi2P)
	}
}

func TestGapsBreakPairsAndRuns(t *testing.T) {
	var b strings.Builder
	b.WriteString("date,open\n")
	day := time.Date(2027, 1, 1, 0, 0, 0, 0, time.UTC)
	for i := range 120 {
		if i >= 40 && i < 50 { // ten days are missing
			continue
		}
		v := "1"
		if i%4 == 0 {
			v = "0"
		}
		if i == 70 {
			v = ""
		}
		fmt.Fprintf(&b, "%s,%s\n", day.AddDate(0, 0, i).Format(time.DateOnly), v)
	}
	rec, err := Read("r.csv", strings.NewReader(b.String()), Columns{})
	if err != nil {
		t.Fatal(err)
	}
	f := FitRecord(rec)
	if f.Rows != 109 || f.Gaps != 2 || f.Missing != 1 {
		t.Errorf("%d rows, %d gaps, %d missing; want 109, 2, 1", f.Rows, f.Gaps, f.Missing)
	}
	if f.OpenRuns.Longest != 3 || f.OpenRuns.Mean != 3 {
		t.Errorf("whole open runs are 3 days; got mean %g, longest %d", f.OpenRuns.Mean, f.OpenRuns.Longest)
	}
	// June has no row: it lies on the line from April to January.
	if f.MonthRows[5] != 0 || !(f.Months[5] > 0 && f.Months[5] < 1) {
		t.Errorf("June: %d rows, share %g", f.MonthRows[5], f.Months[5])
	}
}

func TestBadRecords(t *testing.T) {
	rows := func(n int) string {
		var b strings.Builder
		day := time.Date(2027, 1, 1, 0, 0, 0, 0, time.UTC)
		for i := range n {
			fmt.Fprintf(&b, "%s,%d\n", day.AddDate(0, 0, i).Format(time.DateOnly), i%2)
		}
		return b.String()
	}
	tests := []struct {
		name, text string
		cols       Columns
		want       string
	}{
		{"empty", "", Columns{}, "r.csv:1: the file is empty"},
		{"no time", "a,open\n", Columns{}, "r.csv:1: there is no column date or time"},
		{"no open", "date,rain\n", Columns{}, "want --open with a condition"},
		{"bad condition", "date,rain\n", Columns{Open: "rain"}, `--open is "rain"; want COLUMN`},
		{"unknown column", "date,rain\n", Columns{Open: "rian<=0"}, `--open: there is no column "rian"; want one of date, rain`},
		{"bad limit", "date,rain\n", Columns{Open: "rain<=dry"}, `"dry" is no number`},
		{"short", "date,open\n" + rows(10), Columns{}, "it has 10 rows with a value; want 60 or more"},
		{"bad date", "date,open\n2027-13-01,1\n", Columns{}, `r.csv:2: "2027-13-01" is no date`},
		{"twice", "date,open\n2027-01-01,1\n2027-01-01,1\n", Columns{}, "r.csv:3: its time is that of the row above"},
		{"backwards", "date,open\n2027-01-02,1\n2027-01-01,1\n", Columns{}, "r.csv:3: its time is before"},
		{"not a number", "date,rain\n2027-01-02,wet\n", Columns{Open: "rain<=0"}, `r.csv:2: rain: "wet" is no number`},
	}
	for _, tt := range tests {
		_, err := Read("r.csv", strings.NewReader(tt.text), tt.cols)
		if err == nil || !strings.Contains(err.Error(), tt.want) {
			t.Errorf("%s: %v; want %q in it", tt.name, err, tt.want)
		}
	}
	if _, err := Read("r.csv", strings.NewReader("date,open\n"+rows(60)), Columns{}); err != nil {
		t.Error(err)
	}
}
