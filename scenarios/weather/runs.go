package weather

import "gonum.org/v1/gonum/stat/distuv"

// eachRun calls f with the length in rows of every whole run of a state.
func eachRun(rec *Record, open bool, f func(length int)) {
	s := rec.Samples
	start := -1 // of the present run; -1: none that began whole
	for i := 1; i <= len(s); i++ {
		neighbours := i < len(s) && s[i].At-s[i-1].At == rec.Step
		switch {
		case !neighbours:
			start = -1
		case s[i].Open == s[i-1].Open:
		case s[i].Open == open:
			start = i
		default:
			if start >= 0 {
				f(i - start)
			}
			start = -1
		}
	}
}

// runs describes the runs of a state that stays with a probability.
func runs(rec *Record, open bool, stay float64) Runs {
	var r Runs
	sum := 0
	eachRun(rec, open, func(n int) {
		r.Count++
		sum += n
		r.Longest = max(r.Longest, n)
	})
	if r.Count > 0 {
		r.Mean = float64(sum) / float64(r.Count)
	}
	if stay < 1 {
		r.Geometric = 1 / (1 - stay)
	}
	return r
}

// leastExpected is how many runs a class of the chi-square test must expect
// (Cochran 1954: 5).
const leastExpected = 5

// testRuns compares the lengths of open runs with a geometric distribution:
// Pearson's chi-square over classes of one length each, the last open to the
// top, one parameter estimated.
func (f *Fit) testRuns(rec *Record) {
	n, q := f.OpenRuns.Count, f.OpenOpen
	f.RunChi2P = -1
	if n == 0 || q <= 0 || q >= 1 {
		return
	}
	var classes []float64 // expected
	left := float64(n)
	for k := 1; ; k++ {
		e := left * (1 - q)
		if e < leastExpected || left-e < leastExpected || len(classes) == 60 {
			classes = append(classes, left)
			break
		}
		classes = append(classes, e)
		left -= e
	}
	got := make([]float64, len(classes))
	eachRun(rec, true, func(length int) { got[min(length, len(classes))-1]++ })
	for i, e := range classes {
		f.RunChi2 += (got[i] - e) * (got[i] - e) / e
	}
	f.RunClasses = len(classes)
	if k := len(classes) - 2; k > 0 {
		f.RunChi2P = 1 - distuv.ChiSquared{K: float64(k)}.CDF(f.RunChi2)
	}
}
