package work

import (
	"context"
	"errors"
	"fmt"
	"os"
	"path/filepath"
	"slices"
	"strings"

	"nightwright/constraints"
	"nightwright/constraints/survey"
	"nightwright/scenarios/seasons"
	"nightwright/scheduler"
	"nightwright/scheduler/model"
	"nightwright/scheduler/tables"
	"nightwright/visibility"
)

// SeasonsAsk is what simulated seasons are asked for.
type SeasonsAsk struct {
	Seasons int
	Seed    *uint64 // nil: the survey's
	Shard   string  // K/N; "" for all in one
	Out     string  // folder
}

// ForecastAsk is what a forecast is asked for.
type ForecastAsk struct {
	SeasonsAsk
	Policies  []string
	Hindsight int // seasons planned with their weather known
}

// SeasonsResult is where a forecast or a comparison went: whole, or a part.
type SeasonsResult struct {
	Folder   string
	Part     string // the part's file, with a shard
	Stood    bool   // the part stood there already
	Redone   string // why a part that stood there was written again
	Forecast *seasons.ForecastTables
	Compare  *seasons.CompareTables
}

// Policies lists the words for policies.
func Policies() []string {
	var out []string
	for _, p := range seasons.Policies {
		out = append(out, p.Word)
	}
	return out
}

// asked turns what every simulation is asked for into numbers. kind and words
// say what makes parts belong together.
func (ask *SeasonsAsk) asked(s *Survey, o Options, words ...string) (seasons.Asked, error) {
	a := seasons.Asked{Seed: s.Survey.Seed, Seasons: ask.Seasons, Shard: 1, Shards: 1, Workers: o.Workers, Report: o.Progress}
	if ask.Seed != nil {
		a.Seed = *ask.Seed
	}
	if ask.Seasons < 1 {
		return a, Inputf("--seasons is %d; want 1 or more", ask.Seasons)
	}
	if ask.Shard != "" {
		var rest string
		if n, err := fmt.Sscanf(ask.Shard+" .", "%d/%d %s", &a.Shard, &a.Shards, &rest); n != 3 || err != nil || rest != "." {
			return a, Inputf("--shard is %q; want K/N, such as 3/16", ask.Shard)
		}
		switch {
		case a.Shards < 1 || a.Shard < 1 || a.Shard > a.Shards:
			return a, Inputf("--shard is %s; want K from 1 to N", ask.Shard)
		case a.Shards > a.Seasons:
			return a, Inputf("--shard is %s, and there are %d seasons; want a season a shard or more", ask.Shard, a.Seasons)
		case ask.Out == "":
			return a, Inputf("a shard wants --out with the folder for its part; all shards of a run go to one")
		}
	}
	words = append(words, "survey="+s.Name, "files="+s.sum()[:16], fmt.Sprintf("seed=%d", a.Seed), fmt.Sprintf("seasons=%d", a.Seasons), fmt.Sprintf("lost-time=%d", s.lossesUpTo))
	a.Run = strings.Join(words, "; ")
	return a, nil
}

// Forecast plays seasons out under simulated weather.
func Forecast(ctx context.Context, s *Survey, pt *tables.PlanTables, ask ForecastAsk, o Options) (*SeasonsResult, error) {
	if err := planOf(s, pt); err != nil {
		return nil, err
	}
	if ask.Hindsight < 0 {
		return nil, Inputf("--hindsight is %d; want 0 or more seasons", ask.Hindsight)
	}
	var policies []seasons.Policy
	for _, word := range ask.Policies {
		k := slices.Index(Policies(), word)
		if k < 0 {
			return nil, Inputf("there is no policy %q; there are %s", word, strings.Join(Policies(), ", "))
		}
		if !slices.Contains(policies, seasons.Policies[k].Policy) {
			policies = append(policies, seasons.Policies[k].Policy)
		}
	}
	if len(policies) == 0 {
		return nil, Inputf("no policy was named; want one or more of %s", strings.Join(Policies(), ", "))
	}
	if err := s.TakeLossesOf(ctx, pt); err != nil {
		return nil, err
	}
	sum, err := planSum(pt)
	if err != nil {
		return nil, err
	}
	asked, err := ask.asked(s, o, "forecast", "plan="+sum[:16], "policies="+strings.Join(ask.Policies, "+"), fmt.Sprintf("hindsight=%d", min(ask.Hindsight, ask.Seasons)))
	if err != nil {
		return nil, err
	}
	list, prices, err := s.modelOf(pt)
	if err != nil {
		return nil, err
	}
	return s.play(ctx, &ask.SeasonsAsk, &asked, "forecast", o, func(st *seasons.Stage) ([]tables.PartRow, error) {
		return seasons.Forecast(ctx, st, seasons.ForecastAsk{
			Asked: asked, Policies: policies, List: list, Prices: prices,
			Hindsight: ask.Hindsight, Plan: s.hindsight(asked.Seed, o),
		})
	})
}

// planOf refuses a plan of another survey, or of another state of this one.
func planOf(s *Survey, pt *tables.PlanTables) error {
	if name := pt.Summary.Survey; name != s.Name {
		return Inputf("the plan is of the survey %q, not of %q; want the survey it was made from", name, s.Name)
	}
	if changed := s.Changed(pt); len(changed) > 0 {
		return Inputf("%s changed since the plan was made; plan again, or give the survey that is in the plan's folder", strings.Join(changed, " and "))
	}
	return nil
}

// hindsight plans a season at quick effort with its weather known.
func (s *Survey) hindsight(seed uint64, o Options) seasons.Hindsight {
	return func(ctx context.Context, sv *survey.Survey, losses [][]visibility.Interval) (float64, float64, error) {
		for t := range losses {
			if t < len(s.Losses) {
				losses[t] = append(losses[t], s.Losses[t]...)
			}
		}
		cal := constraints.NewCalendar(sv, s.Exact, losses)
		out, err := scheduler.Solve(ctx, scheduler.Input{Survey: sv, Sky: s.Sky, Calendar: cal, Windows: s.Windows, Workers: o.Workers},
			scheduler.Params{Effort: "quick", Seed: seed})
		if err == nil {
			err = ctx.Err()
		}
		if err != nil {
			return 0, 0, err
		}
		return out.Coverage, out.Ceiling, nil
	}
}

// modelOf turns a plan's tables back into ids.
func (s *Survey) modelOf(pt *tables.PlanTables) ([]model.Exposure, []model.Price, error) {
	fields, scopes := map[string]int32{}, map[string]int32{}
	for i := range s.Fields {
		fields[s.Fields[i].Name] = int32(i)
	}
	for i := range s.Telescopes {
		scopes[s.Telescopes[i].Name] = int32(i)
	}
	steps := map[int64]int32{} // of sets
	var list []model.Exposure
	rows := slices.Clone(pt.Visits)
	tables.Visits.Sort(rows)
	for i := range rows {
		r := &rows[i]
		f, ok1 := fields[r.Field]
		t, ok2 := scopes[r.Telescope]
		if !ok1 || !ok2 {
			return nil, nil, Inputf("visit %d of the plan is of %s on %s, which the survey doesn't have; want the survey it was made from", r.Visit, r.Field, r.Telescope)
		}
		d := slices.IndexFunc(s.Programs[s.Fields[f].Program].Demands, func(d survey.Demand) bool { return d.Name == r.Demand })
		e := model.Exposure{Visit: r.Visit, Set: r.Set, Field: f, Demand: int32(d), Telescope: t, Night: r.Night - int32(s.FirstNight), State: model.Planned, Start: r.Start, End: r.End}
		if r.Set != 0 {
			e.Step = steps[r.Set]
			steps[r.Set]++
		}
		list = append(list, e)
	}
	var prices []model.Price
	for _, r := range pt.Prices {
		if t, ok := scopes[r.Telescope]; ok {
			prices = append(prices, model.Price{Telescope: t, SlotStart: r.SlotStart / model.Micro, PerHour: r.PricePerHour})
		}
	}
	return list, prices, nil
}

// play makes a shard's part, or the whole result; a whole part that stands
// there already is left.
func (s *Survey) play(ctx context.Context, ask *SeasonsAsk, asked *seasons.Asked, kind string, o Options, rows func(*seasons.Stage) ([]tables.PartRow, error)) (*SeasonsResult, error) {
	r := &SeasonsResult{Folder: ask.Out}
	if r.Folder == "" {
		r.Folder = filepath.Join(s.Folder(), kind)
	}
	if err := os.MkdirAll(r.Folder, 0o755); err != nil {
		return nil, Inputf("the results can't go to %s: %v", r.Folder, err)
	}
	if ask.Shard != "" {
		r.Part = filepath.Join(r.Folder, seasons.PartName(asked.Shard, asked.Shards))
		ok, why := seasons.HasPart(r.Part, asked)
		if r.Stood, r.Redone = ok, why; ok {
			return r, nil
		}
	}
	if err := s.OpenWindows(ctx, o); err != nil {
		return nil, err
	}
	o.tell("stage", 0, 1)
	st, err := seasons.NewStage(ctx, s.Survey, s.Sky, s.Calendar, s.Windows, o.Workers)
	if err != nil {
		return nil, err
	}
	part, err := rows(st)
	if err != nil {
		return nil, err
	}
	if err := ctx.Err(); err != nil {
		return nil, err
	}
	if r.Part != "" {
		return r, tables.Parts.WriteFile(r.Part, part)
	}
	return r, r.join(asked.Run, part)
}

// NoWeather names the sites whose sky the survey leaves always open.
func (s *Survey) NoWeather() []string {
	var out []string
	for i := range s.Sites {
		if len(s.Sites[i].Clear) == 0 {
			out = append(out, s.Sites[i].Name)
		}
	}
	return out
}

// Gather joins the parts in a folder; the tables go to out, or there.
func Gather(dir, out string) (*SeasonsResult, error) {
	run, rows, err := seasons.ReadParts(dir)
	var bad *seasons.GatherError
	if errors.As(err, &bad) {
		return nil, &InputError{What: strings.Join(bad.Faults, "\nnightwright: ")}
	}
	if err != nil {
		return nil, err
	}
	if out == "" {
		out = dir
	}
	if err := os.MkdirAll(out, 0o755); err != nil {
		return nil, Inputf("the results can't go to %s: %v", out, err)
	}
	r := &SeasonsResult{Folder: out}
	return r, r.join(run, rows)
}
