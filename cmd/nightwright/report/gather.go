package report

import (
	"cmp"
	"fmt"
	"math"
	"slices"

	"nightwright/cmd/nightwright/draw"
	"nightwright/constraints/survey"
	"nightwright/scheduler/tables"
)

const degree = math.Pi / 180

// gathered is a plan beside its survey.
type gathered struct {
	*Input
	programs []string
	program  map[string]int // by name
	fieldID  map[string]int
	rows     []*tables.FieldRow // by field id
	months   []string
	monthOf  []int // by night
}

func gather(in *Input) (*gathered, error) {
	g := &gathered{Input: in, program: map[string]int{}, fieldID: map[string]int{}}
	for i := range in.Survey.Programs {
		g.programs = append(g.programs, in.Survey.Programs[i].Name)
		g.program[in.Survey.Programs[i].Name] = i
	}
	for i := range in.Survey.Fields {
		g.fieldID[in.Survey.Fields[i].Name] = i
	}
	g.rows = make([]*tables.FieldRow, len(in.Survey.Fields))
	for i := range in.Tables.Fields {
		id, ok := g.fieldID[in.Tables.Fields[i].Field]
		if !ok {
			return nil, fmt.Errorf("the plan has a field %q that its survey hasn't; want the plan folder as it was written", in.Tables.Fields[i].Field)
		}
		g.rows[id] = &in.Tables.Fields[i]
	}
	for i, r := range g.rows {
		if r == nil {
			return nil, fmt.Errorf("the plan has no row for the field %q; want the plan folder as it was written", in.Survey.Fields[i].Name)
		}
	}
	for i := range in.Tables.Visits {
		v := &in.Tables.Visits[i]
		if _, ok := g.fieldID[v.Field]; !ok {
			return nil, fmt.Errorf("the plan has a visit of the field %q that its survey hasn't; want the plan folder as it was written", v.Field)
		}
	}
	for n := range in.Survey.Nights() {
		day := (in.Survey.FirstNight + survey.Day(n)).Time()
		if n == 0 || day.Day() == 1 {
			layout := "Jan"
			if n == 0 || day.Month() == 1 {
				layout = "Jan 2006"
			}
			g.months = append(g.months, day.Format(layout))
		}
		g.monthOf = append(g.monthOf, len(g.months)-1)
	}
	return g, nil
}

// radius is the size in which a field is drawn: its tile's, else that of the
// smallest field of view.
func (g *gathered) radius(f *survey.Field) float64 {
	if f.Tile > 0 {
		return f.Tile / 2
	}
	least := math.Inf(1)
	for i := range g.Survey.Telescopes {
		v := g.Survey.Telescopes[i].FieldOfView
		d := v.Diameter
		if v.Width > 0 {
			d = min(v.Width, v.Height)
		}
		least = min(least, d)
	}
	if math.IsInf(least, 0) {
		return degree / 2
	}
	return least / 2
}

func (g *gathered) skyFields() []draw.SkyField {
	out := make([]draw.SkyField, len(g.rows))
	few := len(g.rows) <= 2000 // a text under the pointer takes place
	for i, r := range g.rows {
		f := &g.Survey.Fields[i]
		got := r.VisitsPlanned + r.VisitsDone
		out[i] = draw.SkyField{RA: f.RA, Dec: f.Dec, Radius: g.radius(f), Value: r.Coverage, Nothing: got == 0 && r.VisitsWanted > 0}
		if few {
			out[i].Hint = fmt.Sprintf("%s (%s): %d of %d visits, coverage %.2f", r.Field, r.Program, got, r.VisitsWanted, r.Coverage)
		}
	}
	return out
}

// course is the growth of coverage: visits by their ends, the bonus of a
// field at its last visit's.
func (g *gathered) course() draw.Course {
	s := &g.Tables.Summary
	type gain struct {
		at   int64
		c    float64
		done bool
	}
	var gains []gain
	done := true
	for i := range g.Tables.Visits {
		v := &g.Tables.Visits[i]
		gains = append(gains, gain{v.End, v.Credit, v.State == "done"})
	}
	total := (1 + g.Survey.FinishBonus) * g.Survey.TotalWeight()
	for i, r := range g.rows {
		if r.Bonus > 0 && r.Last > 0 {
			all := r.VisitsDone >= r.VisitsWanted
			gains = append(gains, gain{r.Last, g.Survey.WeightOf(&g.Survey.Fields[i]) * r.Bonus / total, all})
		}
	}
	slices.SortStableFunc(gains, func(a, b gain) int { return cmp.Compare(a.at, b.at) })
	c := draw.Course{
		From: g.Survey.FirstNight.Unix() + 43200, To: (g.Survey.LastNight + 1).Unix() + 43200, Ceiling: s.Ceiling,
	}
	const points = 480
	step := (c.To - c.From) / points
	sum, got, last := 0.0, 0.0, 0.0
	put := func(t float64) {
		c.Planned = append(c.Planned, draw.Mark{T: t, Value: sum})
		if got > 0 && done {
			c.Done = append(c.Done, draw.Mark{T: t, Value: got})
		}
	}
	c.From = min(c.From, firstOf(gains, func(x gain) float64 { return float64(x.at) / 1e6 }, c.From))
	put(c.From)
	for _, x := range gains {
		t := float64(x.at) / 1e6
		if t-last > step {
			put(t)
			last = t
		}
		sum += x.c
		if x.done {
			got += x.c
			c.Now = t
		}
	}
	put(c.To)
	for len(c.Done) > 0 && c.Done[len(c.Done)-1].T > c.Now {
		c.Done = c.Done[:len(c.Done)-1]
	}
	if c.Now > 0 {
		c.Done = append(c.Done, draw.Mark{T: c.Now, Value: got})
	}
	return c
}

func firstOf[T any](rows []T, of func(T) float64, other float64) float64 {
	if len(rows) == 0 {
		return other
	}
	return of(rows[0])
}

// spacing are the edges of the cadence histogram, d.
var spacing = []struct {
	to    float64
	label string
}{
	{1.0 / 24, "under 1 h"}, {0.5, "1-12 h"}, {1.5, "1 d"}, {2.5, "2 d"}, {3.5, "3 d"}, {4.5, "4 d"}, {5.5, "5 d"}, {7.5, "6-7 d"}, {10.5, "8-10 d"},
	{14.5, "11-14 d"}, {21.5, "15-21 d"}, {30.5, "22-30 d"}, {math.Inf(1), "over 30 d"},
}

// cadence counts the times between consecutive visits of one demand of one
// field; a set counts by its first exposure.
func (g *gathered) cadence() []draw.Bin {
	bins := make([]draw.Bin, len(spacing))
	for i := range bins {
		bins[i] = draw.Bin{Label: spacing[i].label, Count: make([]int, len(g.programs))}
	}
	type key struct{ field, demand string }
	type last struct {
		start, set int64
	}
	before := map[key]last{}
	for i := range g.Tables.Visits {
		v := &g.Tables.Visits[i]
		k := key{v.Field, v.Demand}
		b, seen := before[k]
		if seen && v.Set != 0 && v.Set == b.set {
			continue
		}
		before[k] = last{v.Start, v.Set}
		if !seen {
			continue
		}
		days := float64(v.Start-b.start) / 86400e6
		n := 0
		for days >= spacing[n].to {
			n++
		}
		bins[n].Count[g.program[v.Program]]++
	}
	return bins
}
