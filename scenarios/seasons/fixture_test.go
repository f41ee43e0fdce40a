package seasons

import (
	"context"
	"os"
	"path/filepath"
	"sync"
	"testing"

	"nightwright/constraints"
	"nightwright/constraints/survey"
	"nightwright/scenarios/starter"
	"nightwright/scenarios/surveyfile"
	"nightwright/scheduler"
	"nightwright/scheduler/model"
	"nightwright/visibility"
	"nightwright/visibility/ephemeris"
)

// stageKit is a stage with what it was made from.
type stageKit struct {
	*Stage
	exact *visibility.Exact
	sky   *visibility.Sky
	win   *constraints.Windows
}

func build(t testing.TB, sv *survey.Survey) *stageKit {
	t.Helper()
	ctx := context.Background()
	k := &stageKit{exact: visibility.NewExact(ephemeris.NewClock(sv.LeapSeconds, sv.Orientation))}
	cal := constraints.NewCalendar(sv, k.exact, nil)
	k.sky = constraints.Tables(sv, k.exact, 2)
	var err error
	if k.win, err = constraints.NewWindows(ctx, sv, k.sky, cal, 2); err != nil {
		t.Fatal(err)
	}
	if k.Stage, err = NewStage(ctx, sv, k.sky, cal, k.win, 2); err != nil {
		t.Fatal(err)
	}
	return k
}

// cloudy gives every site of a survey the same weather.
func cloudy(sv *survey.Survey, clear, persistence float64) *survey.Survey {
	for i := range sv.Sites {
		sv.Sites[i].Clear = make([]float64, 12)
		for m := range sv.Sites[i].Clear {
			sv.Sites[i].Clear[m] = clear
		}
		sv.Sites[i].Persistence = persistence
	}
	return sv
}

// small is the family of 2 sites x 14 nights x 150 fields, under clouds.
var small = sync.OnceValue(func() *survey.Survey { return cloudy(starter.Family("small", 1), 0.65, 14*3600) })

// demo is the demo survey, with sets, keep_free, a mount that flips, shares
// and a finish bonus, cut to some nights.
func demo(t testing.TB, nights int) *survey.Survey {
	t.Helper()
	sv := loaded(t, "demo")
	sv.LastNight = sv.FirstNight + survey.Day(nights-1)
	return sv
}

// loaded is a starter survey.
func loaded(t testing.TB, like string) *survey.Survey {
	t.Helper()
	files, err := starter.Files(like, 0)
	if err != nil {
		t.Fatal(err)
	}
	dir := t.TempDir()
	for name, data := range files {
		if err := os.WriteFile(filepath.Join(dir, name), data, 0o644); err != nil {
			t.Fatal(err)
		}
	}
	sv, _, issues := surveyfile.Load(dir)
	if sv == nil {
		t.Fatal(issues)
	}
	return sv
}

// play gathers the outcomes of some seasons.
func play(t testing.TB, st *Stage, cast Cast, seed uint64, n, workers int) []*Outcome {
	t.Helper()
	var out []*Outcome
	if err := NewTroupe(st, cast).Play(context.Background(), seed, 0, n, workers, func(o *Outcome) { out = append(out, o) }); err != nil {
		t.Fatal(err)
	}
	return out
}

// hindsight plans a season with its weather known.
func hindsight(k *stageKit, params scheduler.Params, known *survey.Survey, losses [][]visibility.Interval) (*model.Outcome, error) {
	cal := constraints.NewCalendar(known, k.exact, losses)
	return scheduler.Solve(context.Background(), scheduler.Input{Survey: known, Sky: k.sky, Calendar: cal, Windows: k.win, Workers: 2}, params)
}
