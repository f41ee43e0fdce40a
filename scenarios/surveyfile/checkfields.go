package surveyfile

import (
	"fmt"
	"math"
	"slices"

	"nightwright/constraints/survey"
	"nightwright/visibility"
)

// suspicion counts the fields that one warning is about.
type suspicion struct {
	what, want string // what has one %s, for the first field's name
	line       int
	name       string
	count      int
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
		s.all[i].count++
		return
	}
	s.byKey[key] = len(s.all)
	s.all = append(s.all, suspicion{what, want, line, name, 1})
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
	for i := range l.sv.Fields {
		field := &l.sv.Fields[i]
		used[field.Program] = true
		l.checkDates(field, int(f.lines[i]), &found)
		for d := range l.sv.Programs[field.Program].Demands {
			l.checkFieldDemand(field, d, carriers[field.Program][d], int(f.lines[i]), &found)
		}
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

// checkDates finds fields whose dates leave nothing of the period.
func (l *loader) checkDates(f *survey.Field, line int, found *suspicions) {
	if l.sv.Nights() < 1 || l.sv.LastNight == 0 {
		return
	}
	if f.NotBefore > (l.sv.LastNight+2).Unix() || f.NotAfter < (l.sv.FirstNight-1).Unix() {
		found.add("dates", "not_before and not_after of %s leave nothing of the period", "are their years right?", f.Name, line)
	}
}

// checkFieldDemand finds out whether anyone can ever observe a demand of a
// field: by the lists of telescopes, by the tile, and by how high it rises.
func (l *loader) checkFieldDemand(f *survey.Field, d int, carriers []int, line int, found *suspicions) {
	if len(carriers) == 0 {
		return // told already
	}
	demand := l.sv.Programs[f.Program].Name + ", " + l.sv.Programs[f.Program].Demands[d].Name
	listed, holding, rising := 0, 0, 0
	limit := "altitude_min_deg"
	for _, t := range carriers {
		tel := &l.sv.Telescopes[t]
		if f.Telescopes != nil && !slices.Contains(f.Telescopes, t) {
			continue
		}
		listed++
		if f.Tile > 0 && !tel.FieldOfView.Holds(f.Tile) {
			found.add("tile of "+tel.Name, "the tile of %s is larger than the field of view of "+tel.Name,
				tel.Name+" won't observe it; want a tile_deg that fits", f.Name, line)
			continue
		}
		holding++
		rule := tooLow(f, &f.Rules[d], tel, l.sv.Sites[tel.Site].Latitude)
		if rule == "" {
			rising++
		} else {
			limit = rule
		}
	}
	switch {
	case listed == 0:
		found.add("listed"+demand, "none of the telescopes of %s carries what "+demand+" wants", "want another in its telescopes column", f.Name, line)
	case holding == 0:
		found.add("tile"+demand, "the tile of %s is larger than every field of view that "+demand+" could use: it can't be observed", "want a tile_deg that fits", f.Name, line)
	case rising == 0:
		found.add(limit+demand, "%s never rises high enough for "+demand+": "+limit+" shuts it out at every site", "want a lower limit, or another declination", f.Name, line)
	}
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
