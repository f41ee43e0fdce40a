package surveyfile

import (
	"fmt"
	"math"
	"strings"

	"nightwright/constraints/survey"
)

// row reads one field.
func (f *fieldList) row(cells []string, line int) {
	before := f.told
	field := survey.Field{Program: -1}
	if name, ok := f.need(cells, "field", line); ok {
		if fix := badName(name); fix != "" {
			f.fault(line, fmt.Sprintf("field: %q is no name", clip(name)), fix)
		} else if first, twice := f.seen[name]; twice {
			f.fault(line, fmt.Sprintf("the field %q is there twice, first on line %d", clip(name), first), "give each field its own name, and one program")
		} else {
			field.Name = strings.Clone(name)
			f.seen[field.Name] = int32(line)
		}
	}
	f.position(cells, line, &field)
	if name, ok := f.need(cells, "program", line); ok {
		if id, ok := f.l.programs.ids[name]; ok {
			field.Program = id
		} else if !f.l.programs.unknown {
			f.fault(line, fmt.Sprintf("the program %q is not defined", clip(name)), oneOf(name, "programs", f.l.programs.known()))
		}
	}
	field.Weight = f.number(cells, "weight", line, span{low: 0, high: 1e9}, 1)
	motion := span{low: -20_000, high: 20_000, unit: " mas a year"}
	field.PMRA = f.number(cells, "pm_ra_mas_yr", line, motion, 0) * milliarcsecond
	field.PMDec = f.number(cells, "pm_dec_mas_yr", line, motion, 0) * milliarcsecond
	field.NotBefore = f.date(cells, "not_before", line, 0, math.Inf(-1))
	field.NotAfter = f.date(cells, "not_after", line, daySeconds, math.Inf(1))
	if field.NotAfter <= field.NotBefore {
		f.fault(line, "not_after is not later than not_before", "want the earlier one in not_before")
	}
	if text := f.cell(cells, "tile_deg"); text != "" && !isNone(text) {
		field.Tile = f.number(cells, "tile_deg", line, span{low: 0, high: 180, openLow: true, unit: " degrees"}, 0) * degree
	}
	field.Telescopes = f.telescopes(cells, line)
	own := f.rules(cells, line)
	if f.told > before || field.Program < 0 {
		return
	}
	field.Rules = f.base[field.Program]
	if len(own) > 0 {
		field.Rules = make([]survey.Rules, len(f.base[field.Program]))
		for i := range field.Rules {
			field.Rules[i] = apply(f.base[field.Program][i], own)
		}
	}
	f.l.sv.Fields = append(f.l.sv.Fields, field)
	f.lines = append(f.lines, int32(line))
}

// position reads right ascension and declination.
func (f *fieldList) position(cells []string, line int, field *survey.Field) {
	if text, ok := f.need(cells, "ra_deg", line); ok {
		ra, plain, err := parseRA(text)
		if err != nil {
			f.fault(line, fmt.Sprintf("ra_deg: %q %s", clip(text), err), wantRA)
		}
		f.hours = f.hours && plain && ra < 24
		field.RA = ra * degree
	}
	if text, ok := f.need(cells, "dec_deg", line); ok {
		dec, err := parseDec(text)
		if err != nil {
			f.fault(line, fmt.Sprintf("dec_deg: %q %s", clip(text), err), wantDec)
		}
		field.Dec = dec * degree
	}
}

// date reads an instant, or a date that stands for its 00:00Z plus shift.
func (f *fieldList) date(cells []string, column string, line int, shift, missing float64) float64 {
	text := f.cell(cells, column)
	if text == "" || isNone(text) {
		return missing
	}
	if day, err := survey.ParseDay(text); err == nil {
		return day.Unix() + shift
	}
	v, err := parseInstant(text)
	if err != nil {
		f.fault(line, fmt.Sprintf("%s: %q %s", column, clip(text), err), wantInstant+", or a date")
		return missing
	}
	return v
}

// telescopes reads names with semicolons between; nil when there are none.
// Rows with the same text share one list.
func (f *fieldList) telescopes(cells []string, line int) []int {
	text := f.cell(cells, "telescopes")
	if text == "" || strings.EqualFold(text, "all") {
		return nil
	}
	if ids, ok := f.lists[text]; ok {
		return ids
	}
	var ids []int
	before := f.told
	seen := map[int]bool{}
	for _, word := range strings.Split(text, ";") {
		word = strings.TrimSpace(word)
		id, ok := f.l.telescopes.ids[word]
		switch {
		case word == "":
			f.fault(line, fmt.Sprintf("telescopes: %q has an empty name", clip(text)), "want names with ; between")
		case !ok && !f.l.telescopes.unknown:
			f.fault(line, fmt.Sprintf("the telescope %q is not defined", clip(word)), oneOf(word, "telescopes", f.l.telescopes.known()))
		case ok && seen[id]:
			f.fault(line, fmt.Sprintf("%q is there twice in telescopes", clip(word)), "name each telescope once")
		case ok:
			seen[id] = true
			ids = append(ids, id)
		}
	}
	if f.told == before {
		f.lists[strings.Clone(text)] = ids
	}
	return ids
}

// rules reads a field's own rules.
func (f *fieldList) rules(cells []string, line int) []override {
	var own []override
	for _, s := range ruleSpecs {
		text := f.cell(cells, s.key)
		switch {
		case text == "":
		case s.none != 0 && isNone(text):
			own = append(own, override{s.rule, s.none})
		default:
			own = append(own, override{s.rule, f.number(cells, s.key, line, s.in, 0) * s.scale})
		}
	}
	return own
}

// demandRules works out, by program, each demand's rules before a field's
// own: the survey's, then the program's, then the demand's.
func (l *loader) demandRules() [][]survey.Rules {
	base := make([][]survey.Rules, len(l.sv.Programs))
	for p := range base {
		base[p] = make([]survey.Rules, len(l.sv.Programs[p].Demands))
		for d := range base[p] {
			base[p][d] = apply(l.marks.rules, l.marks.demands[p][d].rules)
		}
	}
	return base
}
