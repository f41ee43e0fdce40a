package seasons

import (
	"context"
	"fmt"
	"os"
	"testing"
	"time"

	"nightwright/constraints"
	"nightwright/constraints/survey"
	"nightwright/scenarios/starter"
	"nightwright/scenarios/surveyfile"
	"nightwright/scenarios/weather"
	"nightwright/scheduler"
	"nightwright/visibility"
	"nightwright/visibility/ephemeris"
)

func TestProbe(t *testing.T) {
	name := os.Getenv("PROBE")
	if name == "" {
		t.SkipNow()
	}
	var sv *survey.Survey
	if sv = starter.Family(name, 1); sv == nil {
		sv, _, _ = surveyfile.Load(name)
	} else {
		for i := range sv.Sites {
			sv.Sites[i].Clear = make([]float64, 12)
			for m := range 12 {
				sv.Sites[i].Clear[m] = 0.7
			}
			sv.Sites[i].Persistence = 14 * 3600
		}
	}
	ctx := context.Background()
	exact := visibility.NewExact(ephemeris.NewClock(nil, sv.Orientation))
	cal := constraints.NewCalendar(sv, exact, nil)
	sky := constraints.Tables(sv, exact, 2)
	win, err := constraints.NewWindows(ctx, sv, sky, cal, 2)
	if err != nil {
		t.Fatal(err)
	}
	b := time.Now()
	st, err := NewStage(ctx, sv, sky, cal, win, 2)
	if err != nil {
		t.Fatal(err)
	}
	fmt.Println("stage", time.Since(b), "options MB", len(st.qualities)>>20, "blocks", st.blocks)
	n := 20
	if os.Getenv("N") != "" {
		fmt.Sscan(os.Getenv("N"), &n)
	}
	for _, pol := range []Policy{Densest, FixedPrices, Resolved} {
		b := time.Now()
		tr := NewTroupe(st, Cast{Policy: pol})
		fmt.Println(pol, "troupe", time.Since(b))
		b = time.Now()
		var c, fin, used, lost, open, wasted, vis float64
		var first []float64
		tr.Play(ctx, 7, 0, n, 2, func(o *Outcome) {
			c += o.Coverage / float64(n)
			fin += float64(o.Finished) / float64(n)
			used += o.Used / float64(n)
			lost += o.Lost / float64(n)
			open += o.Open / float64(n)
			wasted += o.Wasted / float64(n)
			vis += float64(o.Visits) / float64(n)
			if len(first) < 4 {
				first = append(first, o.Coverage)
			}
		})
		fmt.Printf("%v: coverage %.4f finished %.1f visits %.0f open %.0f lost %.0f used %.0f wasted %.1f; %v a season; %v\n", pol, c, fin, vis, open, lost, used, wasted, time.Since(b)/time.Duration(n), first)
	}
	k := 0
	if os.Getenv("H") != "" {
		fmt.Sscan(os.Getenv("H"), &k)
	}
	for i := range k {
		ws := weather.NewSky(st.climates, st.first, st.hours)
		ws.Draw(7, uint64(i))
		losses := make([][]visibility.Interval, len(sv.Telescopes))
		for tel := range losses {
			for h := st.first; h < st.first+int64(st.hours); h++ {
				if !ws.Open(sv.Telescopes[tel].Site, h) {
					losses[tel] = append(losses[tel], visibility.Interval{From: float64(h * 3600), To: float64((h + 1) * 3600)})
				}
			}
		}
		b := time.Now()
		c2 := constraints.NewCalendar(sv, exact, losses)
		out, err := scheduler.Solve(ctx, scheduler.Input{Survey: sv, Sky: sky, Calendar: c2, Windows: win, Workers: 2}, scheduler.Params{Effort: "quick", Seed: 1})
		fmt.Println("hindsight", i, out.Coverage, out.Ceiling, err, time.Since(b))
	}
}
