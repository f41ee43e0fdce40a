package tables

import (
	"io"
	"slices"
	"testing"

	"nightwright/constraints/survey"
	"nightwright/scheduler/model"
)

// seasonPlan fills 60 nights of the small survey back to back with 90 s
// exposures: some 50,000, legal or not, for what counts here is their number.
func seasonPlan(b *testing.B) (*fixture, *model.Outcome) {
	sv := smallSurvey()
	sv.LastNight = sv.FirstNight + survey.Day(59)
	f := prepare(b, sv)
	plan := &model.Plan{}
	for n := range sv.Nights() {
		for t := range sv.Telescopes {
			for _, o := range f.cal.Open(t, n) {
				for at := int64(o.From) + 1; float64(at+90) < o.To; at += 100 {
					field := int32(len(plan.Exposures) / 7 % len(sv.Fields) &^ 1) // the program without sets
					plan.Exposures = append(plan.Exposures, model.Exposure{Field: field, Telescope: int32(t), Night: int32(n), State: model.Planned, Start: at * 1e6, End: (at + 60) * 1e6})
				}
			}
		}
	}
	slices.SortStableFunc(plan.Exposures, func(a, b model.Exposure) int { return int((a.Start - b.Start) / 1e6) })
	for i := range plan.Exposures {
		plan.Exposures[i].Visit = int64(i + 1)
	}
	return f, f.outcome(plan)
}

// BenchmarkBuild reports the time an exposure takes, on two workers.
func BenchmarkBuild(b *testing.B) {
	f, out := seasonPlan(b)
	b.ReportAllocs()
	for b.Loop() {
		if _, err := f.build(out, 2); err != nil {
			b.Fatal(err)
		}
	}
	b.ReportMetric(float64(b.Elapsed().Nanoseconds())/float64(b.N)/float64(len(out.Plan.Exposures)), "ns/exposure")
	b.ReportMetric(float64(len(out.Plan.Exposures)), "exposures")
}

// BenchmarkVisits writes and reads 300,000 rows.
func BenchmarkVisits(b *testing.B) {
	rows := sampleRows[VisitRow](300000)
	data, err := Visits.Encode(rows)
	if err != nil {
		b.Fatal(err)
	}
	b.Run("write", func(b *testing.B) {
		for b.Loop() {
			if err := Visits.Write(io.Discard, rows); err != nil {
				b.Fatal(err)
			}
		}
	})
	b.Run("read", func(b *testing.B) {
		for b.Loop() {
			if _, err := Visits.Decode("visits", data); err != nil {
				b.Fatal(err)
			}
		}
		b.ReportMetric(float64(len(data))/float64(len(rows)), "B/row")
	})
	b.Run("csv", func(b *testing.B) {
		for b.Loop() {
			if err := Visits.WriteCSV(io.Discard, rows); err != nil {
				b.Fatal(err)
			}
		}
	})
}
