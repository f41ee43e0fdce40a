package work

import (
	"fmt"
	"path/filepath"

	"nightwright/scheduler/tables"
)

// Differences tells how the survey differs from the one that a plan was made
// from, whose files stand in the plan's folder.
func (s *Survey) Differences(dir string, pt *tables.PlanTables) []string {
	changed := s.Changed(pt)
	if len(changed) == 0 {
		return nil
	}
	var out []string
	for _, name := range changed {
		out = append(out, name+" has another sha256 than the plan's copy")
	}
	before, err := ReadSurvey(filepath.Join(dir, "survey"))
	if err != nil {
		return append(out, "the plan's copy can't be read, so that it can't be told more")
	}
	return append(out, compareSurveys(before, s)...)
}

// compareSurveys counts what differs between two surveys.
func compareSurveys(a, b *Survey) []string {
	var out []string
	tell := func(n int, format string) {
		if n > 0 {
			out = append(out, fmt.Sprintf(format, n))
		}
	}
	was, is := newNames(a.Survey), newNames(b.Survey)
	added, removed, weights, places := 0, 0, 0, 0
	for i := range b.Fields {
		k, ok := was.fields[b.Fields[i].Name]
		switch {
		case !ok:
			added++
			continue
		case a.WeightOf(&a.Fields[k]) != b.WeightOf(&b.Fields[i]):
			weights++
		}
		if a.Fields[k].RA != b.Fields[i].RA || a.Fields[k].Dec != b.Fields[i].Dec {
			places++
		}
	}
	for i := range a.Fields {
		if _, ok := is.fields[a.Fields[i].Name]; !ok {
			removed++
		}
	}
	tell(added, "%d fields are new")
	tell(removed, "%d fields are gone")
	tell(weights, "%d fields weigh otherwise")
	tell(places, "%d fields lie elsewhere")
	for i := range b.Telescopes {
		if _, ok := was.telescopes[b.Telescopes[i].Name]; !ok {
			out = append(out, "telescope "+b.Telescopes[i].Name+" is new")
		}
	}
	for i := range a.Telescopes {
		if _, ok := is.telescopes[a.Telescopes[i].Name]; !ok {
			out = append(out, "telescope "+a.Telescopes[i].Name+" is gone")
		}
	}
	if a.FirstNight != b.FirstNight || a.LastNight != b.LastNight {
		out = append(out, fmt.Sprintf("the period is %s to %s; it was %s to %s", b.FirstNight, b.LastNight, a.FirstNight, a.LastNight))
	}
	if closures(a) != closures(b) {
		out = append(out, fmt.Sprintf("there are %d closures; there were %d", closures(b), closures(a)))
	}
	return out
}

func closures(s *Survey) int {
	n := 0
	for i := range s.Sites {
		n += len(s.Sites[i].Closures)
	}
	for i := range s.Telescopes {
		n += len(s.Telescopes[i].Closures)
	}
	return n
}
