package surveyfile

import (
	"fmt"
	"math"
	"slices"
	"strings"

	"nightwright/constraints/survey"
	"nightwright/visibility"
)

// suspicion counts the fields that one warning is about.
type suspicion struct {
	what, want string // what has one %s, for the first field's name
	line       int
	name       string
	count      int
	last       int // line of the last field counted
}

// suspicions keeps them in the order in which they were met.
type suspicions struct {
	byKey map[string]int
	all   []suspicion
}

func (s *suspicions) add(key, what, want, name string, line int) {
	if s.byKey == nil {
		s.byKey = map[string]int{}
	}
	if i, ok := s.byKey[key]; ok {
		if s.all[i].last != line {
			s.all[i].count++
			s.all[i].last = line
		}
		return
	}
	s.byKey[key] = len(s.all)
	s.all = append(s.all, suspicion{what, want, line, name, 1, line})
}

// checkFields checks the fields that were read against everything else.
func (l *loader) checkFields(f *fieldList) {
	whole := sound(l.marks.programs) && sound(l.marks.sites) && sound(l.marks.telescopes) &&
		!l.programs.unknown && !l.telescopes.unknown
	if !whole || len(l.sv.Fields) == 0 {
		return
	}
	if f.told == 0 && l.sv.TotalWeight() == 0 {
		l.fault(l.marks.programs[0].node, "all weights are 0", "want a program and a field of it with a weight over 0")
	}
	used := make([]bool, len(l.sv.Programs))
	carriers := make([][][]int, len(l.sv.Programs))
	for p := range carriers {
		for d := range l.sv.Programs[p].Demands {
			carriers[p] = append(carriers[p], l.carriers(p, d))
		}
	}
	var found suspicions
	stands := map[place]string{}
	for i := range l.sv.Fields {
		field := &l.sv.Fields[i]
		used[field.Program] = true
		l.checkDates(field, int(f.lines[i]), &found)
		at := place{field.Program, math.Round(field.RA / arcsecond), math.Round(field.Dec / arcsecond)}
		if other, twin := stands[at]; !twin {
			stands[at] = field.Name
		} else if !strings.Contains(other, "%") {
			found.add("twins", "the position of %s is that of another field of its program, "+other+": the same sky is asked for twice", "want one of them, with more visits if they are meant", field.Name, int(f.lines[i]))
		}
		l.checkField(field, carriers[field.Program], int(f.lines[i]), &found)
	}
	for _, s := range found.all {
		name := s.name
		if s.count > 1 {
			name += fmt.Sprintf(" and %d more", s.count-1)
		}
		f.warn(s.line, fmt.Sprintf(s.what, name), s.want)
	}
	for p := range used {
		if !used[p] && f.told == 0 {
			l.warn(l.marks.programs[p].node, fmt.Sprintf("no field is of the program %s", l.sv.Programs[p].Name), "want its name in the field list's program column")
		}
	}
}

// place is a position to the arc second, of one program's fields.
type place struct {
	program int
	ra, dec float64 // arc seconds
}

// arcsecond is one, rad.
const arcsecond = degree / 3600

// checkDates finds fields whose dates leave nothing of the period.
func (l *loader) checkDates(f *survey.Field, line int, found *suspicions) {
	if !l.marks.period {
		return
	}
	if f.NotBefore > (l.sv.LastNight+2).Unix() || f.NotAfter < (l.sv.FirstNight-1).Unix() {
		found.add("dates", "not_before and not_after of %s leave nothing of the period", "are their years right?", f.Name, line)
	}
}

// verdict says why a demand of a field can never be observed; the zero value
// is that it may be.
type verdict struct{ what, want string }

// checkField finds out whether anyone can ever observe a field: by the lists
// of telescopes, by the tile, and by how high it rises. Carriers are those of
// each demand of its program.
func (l *loader) checkField(f *survey.Field, carriers [][]int, line int, found *suspicions) {
	program := &l.sv.Programs[f.Program]
	verdicts := make([]verdict, 0, 8)
	same := true
	for d := range carriers {
		verdicts = append(verdicts, l.judge(f, d, carriers[d], line, found))
		same = same && verdicts[d] == verdicts[0]
	}
	for d, v := range verdicts {
		who := program.Name
		if !same {
			who += ", " + program.Demands[d].Name
		}
		if v.what != "" {
			found.add(v.what+who, strings.ReplaceAll(v.what, "WHO", strings.ReplaceAll(who, "%", "%%")), v.want, f.Name, line)
		}
		if same {
			return
		}
	}
}

// judge is checkField for one demand.
func (l *loader) judge(f *survey.Field, d int, carriers []int, line int, found *suspicions) verdict {
	if len(carriers) == 0 {
		return verdict{} // told already
	}
	listed, rising := 0, 0
	var small []string
	limit := ""
	for _, t := range carriers {
		tel := &l.sv.Telescopes[t]
		if f.Telescopes != nil && !slices.Contains(f.Telescopes, t) {
			continue
		}
		listed++
		if f.Tile > 0 && !tel.FieldOfView.Holds(f.Tile) {
			small = append(small, tel.Name)
			continue
		}
		if rule := tooLow(f, &f.Rules[d], tel, l.sv.Sites[tel.Site].Latitude); rule == "" {
			rising++
		} else if limit == "" {
			limit = rule
		}
	}
	switch {
	case listed == 0:
		return verdict{"none of the telescopes of %s carries what WHO wants", "want another in its telescopes column"}
	case len(small) == listed:
		return verdict{"the tile of %s is larger than every field of view that WHO could use: it can't be observed", "want a tile_deg that fits"}
	case rising == 0:
		return verdict{"%s never rises high enough for WHO: " + limit + " shuts it out at every site", "want a lower limit, or another declination"}
	}
	for _, name := range small {
		name = strings.ReplaceAll(name, "%", "%%")
		found.add("tile of "+name, "the tile of %s is larger than the field of view of "+name, "it won't be observed there; want a tile_deg that fits, or leave it so", f.Name, line)
	}
	return verdict{}
}

// tooLow names the limit that a field can't meet even where it stands
// highest, on the meridian; "" when it may. Precession since J2000 and the
// Earth's shape move that by less than the margin.
func tooLow(f *survey.Field, rules *survey.Rules, tel *survey.Telescope, latitude float64) string {
	const margin = 0.75 * degree
	top := min(math.Pi/2, math.Pi/2-math.Abs(latitude-f.Dec)+margin)
	switch {
	case top < rules.AltitudeMin:
		return "altitude_min_deg"
	case visibility.Airmass(math.Sin(top)) > rules.AirmassMax:
		return "airmass_max"
	case top < tel.AltitudeMin || tel.AltitudeMax < rules.AltitudeMin:
		return "the mount's altitude_deg"
	}
	return ""
}
