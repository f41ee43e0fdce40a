package tables

import (
	"cmp"
	"fmt"
	"slices"

	"nightwright/constraints/survey"
)

// shot is one exposure as the count of coverage needs it.
type shot struct {
	field, demand int32
	set           int64
	start         int64
	quality       float64
	done          bool
}

// gotVisit is one visit of a tally: an exposure, or a set of them.
type gotVisit struct {
	field, demand int32
	start         int64
	shots         []int32 // indices of its exposures, by start
	quality       float64 // mean over its exposures
	done          bool
	sound         bool // whole, and no exposure below min_quality
	counts        bool // sound, and among the first the demand wants
}

// tally is the plain count of what exposures earn, by the formula of
// coverage: C = sum_f w_f [sum q / N_f + b (all got)] / ((1+b) sum_f w_f).
type tally struct {
	sv     *survey.Survey
	visits []gotVisit // by field, demand and start
	first  []int32    // visits of field f are visits[first[f]:first[f+1]]
	sum    []float64  // by field: sum of the quality of the visits that count
	got    []int64    // by field
	wanted []int64
}

// count tallies exposures. Ids must be those of the survey.
func count(sv *survey.Survey, shots []shot) *tally {
	t := &tally{
		sv: sv, first: make([]int32, len(sv.Fields)+1),
		sum: make([]float64, len(sv.Fields)), got: make([]int64, len(sv.Fields)), wanted: make([]int64, len(sv.Fields)),
	}
	order := make([]int32, len(shots))
	for i := range order {
		order[i] = int32(i)
	}
	slices.SortStableFunc(order, func(x, y int32) int {
		a, b := &shots[x], &shots[y]
		return cmp.Or(cmp.Compare(a.field, b.field), cmp.Compare(a.demand, b.demand), cmp.Compare(a.start, b.start))
	})
	open := map[int64]int{} // set to its visit, within one demand
	for k, i := range order {
		s := &shots[i]
		if k == 0 || shots[order[k-1]].field != s.field || shots[order[k-1]].demand != s.demand {
			clear(open)
		}
		if v, ok := open[s.set]; ok && s.set != 0 {
			t.visits[v].shots = append(t.visits[v].shots, i)
			continue
		}
		open[s.set] = len(t.visits)
		t.visits = append(t.visits, gotVisit{field: s.field, demand: s.demand, start: s.start, shots: []int32{i}})
	}
	t.judge(shots)
	return t
}

// judge works out what each visit is worth, and the sums of the fields.
func (t *tally) judge(shots []shot) {
	counted := 0
	for i := range t.visits {
		v := &t.visits[i]
		f := &t.sv.Fields[v.field]
		d := &t.sv.Programs[f.Program].Demands[v.demand]
		if i == 0 || t.visits[i-1].field != v.field || t.visits[i-1].demand != v.demand {
			counted = 0
		}
		v.sound, v.done = len(v.shots) == len(d.Exposures), true
		for _, k := range v.shots {
			v.quality += shots[k].quality / float64(len(v.shots))
			v.sound = v.sound && shots[k].quality >= f.Rules[v.demand].MinQuality
			v.done = v.done && shots[k].done
		}
		if v.counts = v.sound && counted < d.Visits; v.counts {
			counted++
			t.got[v.field]++
			t.sum[v.field] += v.quality
		}
		t.first[v.field+1] = int32(i + 1)
	}
	for f := range t.sv.Fields {
		t.first[f+1] = max(t.first[f+1], t.first[f])
		t.wanted[f] = int64(t.sv.Wanted(&t.sv.Fields[f]))
	}
}

// of returns the visits of a field, by demand and start.
func (t *tally) of(field int) []gotVisit { return t.visits[t.first[field]:t.first[field+1]] }

// score sums up the fields that a condition holds for; nil takes all.
func (t *tally) score(holds func(field int) bool) Score {
	var s Score
	b, weight, earned := t.sv.FinishBonus, 0.0, 0.0
	for f := range t.sv.Fields {
		if holds != nil && !holds(f) {
			continue
		}
		w := t.sv.WeightOf(&t.sv.Fields[f])
		weight += w
		earned += w * (t.sum[f] / float64(t.wanted[f]))
		s.VisitsGot += t.got[f]
		s.VisitsWanted += t.wanted[f]
		s.FieldsWanted++
		if t.got[f] == t.wanted[f] {
			s.FieldsFinished++
			earned += w * b
		}
	}
	if weight > 0 {
		s.Coverage = earned / ((1 + b) * weight)
	}
	return s
}

// Coverage recounts what the rows of a plan earn, from their quality alone.
// It errs when a row names a field or demand that the survey hasn't.
func Coverage(sv *survey.Survey, rows []VisitRow) (Score, error) {
	fields := make(map[string]int32, len(sv.Fields))
	for i := range sv.Fields {
		fields[sv.Fields[i].Name] = int32(i)
	}
	shots := make([]shot, len(rows))
	for i := range rows {
		r := &rows[i]
		f, ok := fields[r.Field]
		if !ok {
			return Score{}, fmt.Errorf("visit %d: field %q is not in the survey; want the survey that the plan was made for", r.Visit, r.Field)
		}
		p := &sv.Programs[sv.Fields[f].Program]
		d := slices.IndexFunc(p.Demands, func(d survey.Demand) bool { return d.Name == r.Demand })
		if d < 0 || p.Name != r.Program {
			return Score{}, fmt.Errorf("visit %d: program %q has no demand %q for field %q; want the survey that the plan was made for", r.Visit, r.Program, r.Demand, r.Field)
		}
		shots[i] = shot{f, int32(d), r.Set, r.Start, r.Quality, r.State == "done"}
	}
	return count(sv, shots).score(nil), nil
}
