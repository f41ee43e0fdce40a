package constraints

import (
	"fmt"
	"testing"
)

// The headline size: 6 sites, 182 nights, 6,000 fields in three programs with
// two demands each of different rules: 13.1 million cells.
func BenchmarkNewWindows(b *testing.B) {
	sv := makeSurvey(6, 182, 6000, 1)
	e := newExact()
	sky := Tables(sv, e, 2)
	cal := NewCalendar(sv, e, nil)
	for _, workers := range []int{1, 2} {
		b.Run(fmt.Sprintf("sites=6/nights=182/fields=6000/workers=%d", workers), func(b *testing.B) {
			b.ReportAllocs()
			for b.Loop() {
				w, err := NewWindows(b.Context(), sv, sky, cal, workers)
				if err != nil {
					b.Fatal(err)
				}
				b.ReportMetric(float64(w.Bytes())/1e6, "MB-kept")
			}
		})
	}
}

func BenchmarkNewCalendar(b *testing.B) {
	sv := makeSurvey(6, 182, 6000, 1)
	for b.Loop() {
		if NewCalendar(sv, newExact(), nil).OpenHours(0, 0) == 0 {
			b.Fatal("never open")
		}
	}
}

func BenchmarkNewAccounts(b *testing.B) {
	sv := makeSurvey(6, 182, 6000, 1)
	e := newExact()
	sky, cal := Tables(sv, e, 2), NewCalendar(sv, e, nil)
	for b.Loop() {
		if _, err := NewAccounts(b.Context(), sv, sky, cal, nil, 3600, 2); err != nil {
			b.Fatal(err)
		}
	}
}
