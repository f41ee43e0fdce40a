package explain

import (
	"math"
	"path/filepath"
	"slices"
	"testing"

	"nightwright/constraints"
	"nightwright/constraints/survey"
	"nightwright/scenarios/surveyfile"
	"nightwright/scheduler"
	"nightwright/scheduler/tables"
	"nightwright/visibility"
	"nightwright/visibility/ephemeris"
)

// planned plans the commands' small survey, changed as the test wants it: C1 at
// Cinder Ridge, S1 at Salt Mesa; A1-A5 want 3 visits of 300 s in r, B1-B3 a pair.
func planned(t *testing.T, change func(sv *survey.Survey)) Input {
	t.Helper()
	sv, _, issues := surveyfile.Load(filepath.Join("..", "..", "cmd", "nightwright", "testdata", "small"))
	if sv == nil {
		t.Fatal(issues)
	}
	if change != nil {
		change(sv)
	}
	in := Input{Survey: sv, Exact: visibility.NewExact(ephemeris.NewClock(nil, sv.Orientation)), Workers: 2}
	in.Calendar = constraints.NewCalendar(sv, in.Exact, nil)
	sky := constraints.Tables(sv, in.Exact, 2)
	win, err := constraints.NewWindows(t.Context(), sv, sky, in.Calendar, 2)
	if err != nil {
		t.Fatal(err)
	}
	out, err := scheduler.Solve(t.Context(), scheduler.Input{Survey: sv, Sky: sky, Calendar: in.Calendar, Windows: win, Workers: 2}, scheduler.Params{Effort: "quick"})
	if err != nil {
		t.Fatal(err)
	}
	if in.Plan, err = tables.Build(t.Context(), sv, in.Exact, in.Calendar, win, out, 2); err != nil {
		t.Fatal(err)
	}
	return in
}

func field(t *testing.T, in Input, name string) *Field {
	t.Helper()
	i := slices.IndexFunc(in.Survey.Fields, func(f survey.Field) bool { return f.Name == name })
	f, err := ForField(t.Context(), in, i)
	if err != nil {
		t.Fatal(err)
	}
	return f
}

func TestHoursAddUp(t *testing.T) {
	in := planned(t, nil)
	f := field(t, in, "A1")
	if !f.Finished || f.Got != 3 || len(f.Visits) != 3 || f.Demands[0].Got != 3 || len(f.Demands[0].Windows) != 0 {
		t.Errorf("%+v", f)
	}
	var turn, before float64
	for _, r := range f.Demands[0].Rules {
		turn += r.Turn
		if r.Only > r.Alone+1e-9 || r.Turn > r.Alone+1e-9 {
			t.Errorf("%+v", r)
		}
	}
	after := 0.0
	for _, m := range f.Demands[0].Months {
		before, after = before+m.Before, after+m.After
	}
	if before == 0 || math.Abs(before-turn-after) > 1e-6 {
		t.Errorf("%.2f h before, %.2f taken in turn, %.2f after", before, turn, after)
	}
}

// TestWhatTheTimeIsWorth: with room for a few visits alone, a light field loses to
// heavier ones, and is told to which, by how much, and what weight would win.
func TestWhatTheTimeIsWorth(t *testing.T) {
	in := planned(t, func(sv *survey.Survey) {
		sv.LastNight = sv.FirstNight
		for i := range sv.Telescopes {
			sv.Telescopes[i].KeepFree, sv.Telescopes[i].Reserved = 0, nil
			// Ten minutes of the first night alone.
			night := sv.FirstNight.Unix()
			open := night + 86400 + 5*3600
			sv.Telescopes[i].Closures = []survey.Closure{{From: night, To: open}, {From: open + 620, To: night + 4*86400}}
		}
		for i := range sv.Fields {
			sv.Fields[i].Weight = 10
		}
		sv.Fields[0].Weight = 1
	})
	f := field(t, in, "A1")
	if f.Got != 0 {
		t.Fatal("the light field got a visit: the survey doesn't crowd")
	}
	d := f.Demands[0]
	if len(d.Windows) == 0 {
		t.Fatalf("%+v", d)
	}
	w := d.Windows[0]
	if w.Why != Taken || len(w.Rivals) == 0 {
		t.Fatalf("%+v", w)
	}
	sum := 0.0
	for _, r := range w.Rivals {
		k := slices.IndexFunc(in.Plan.Visits, func(v tables.VisitRow) bool { return v.Visit == r.Visit })
		if v := &in.Plan.Visits[k]; v.Field != r.Field || float64(v.Start)/1e6 > w.Best+400 || float64(v.End)/1e6 < w.Best-100 {
			t.Errorf("rival %+v of a visit at %f", r, w.Best)
		}
		sum += r.Worth
	}
	help := slices.IndexFunc(d.Helps, func(h Help) bool { return h.Factor > 0 })
	if help < 0 || d.Helps[help].Factor > sum/w.Worth*(1+1e-9) || d.Helps[help].Factor < 1 {
		t.Errorf("rivals are worth %g, the visit %g; helps %+v", sum, w.Worth, d.Helps)
	}
}

// TestRulesThatShut: a rule that nothing passes is named with the hours it takes.
func TestRulesThatShut(t *testing.T) {
	in := planned(t, func(sv *survey.Survey) {
		for d := range sv.Fields[0].Rules {
			sv.Fields[0].Rules[d].AltitudeMin = 89.9 * math.Pi / 180
		}
	})
	d := field(t, in, "A1").Demands[0]
	if len(d.Windows) != 0 || len(d.Helps) < 2 || d.Helps[1].What != "without the rule altitude" || d.Helps[1].Hours < 1 {
		t.Errorf("windows %v, helps %+v", d.Windows, d.Helps)
	}
}

// TestCadenceBars: once a night leaves a field that wants more visits than there
// are nights with windows, all barred by its own.
func TestCadenceBars(t *testing.T) {
	in := planned(t, func(sv *survey.Survey) {
		d := &sv.Programs[sv.Fields[0].Program].Demands[0]
		d.Visits, d.GapMin, d.PerNight = 12, 20*3600, 1
	})
	f := field(t, in, "A1")
	d := f.Demands[0]
	if d.Got >= 12 || len(d.Windows) == 0 {
		t.Fatalf("%+v", d)
	}
	for _, w := range d.Windows {
		if w.Why == Cadence && w.Near != 0 && math.Abs(float64(w.Near)/1e6-w.Best) >= 20*3600 {
			t.Errorf("%+v", w)
		}
	}
	if !slices.ContainsFunc(d.Windows, func(w Window) bool { return w.Why == Cadence }) {
		t.Errorf("no window is barred: %+v", d.Windows)
	}
	in.Now = math.MaxInt64
	for _, w := range field(t, in, "A1").Demands[0].Windows {
		if w.Why != Over {
			t.Errorf("after the end: %+v", w)
		}
	}
}

func TestNight(t *testing.T) {
	in := planned(t, nil)
	n, err := ForNight(t.Context(), in, 0, 0)
	if err != nil {
		t.Fatal(err)
	}
	visits, open, idle := 0, 0.0, 0.0
	for _, p := range n.Programs {
		visits += p.Visits
	}
	for _, o := range in.Calendar.Open(0, 0) {
		open += o.To - o.From
	}
	for _, i := range n.Idle {
		idle += i.To - i.From
		for _, o := range n.Idle {
			if o != i && o.From < i.To && i.From < o.To {
				t.Errorf("%+v and %+v overlap", i, o)
			}
		}
	}
	if int64(visits) != n.Row.Visits || visits == 0 || idle > open-n.Row.ExposureHours*3600+1 || idle < 0.5*(open-n.Row.UsedHours*3600) {
		t.Errorf("%d visits of %d, %.0f s idle of %.0f open, %.2f h used", visits, n.Row.Visits, idle, open, n.Row.UsedHours)
	}
	if len(n.Shut) == 0 || n.Shut[0].Why != "reserved" {
		t.Errorf("%+v", n.Shut)
	}
	closed, err := ForNight(t.Context(), in, 1, 2) // Salt Mesa is closed then
	if err != nil || len(closed.Idle) != 0 || len(closed.Shut) == 0 || closed.Row.Visits != 0 {
		t.Errorf("%+v, %v", closed, err)
	}
}
