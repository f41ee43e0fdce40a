package surveyfile

import (
	"errors"
	"fmt"
	"io"
	"path/filepath"
	"strconv"
	"strings"

	"go.yaml.in/yaml/v3"

	"nightwright/constraints/survey"
)

// maxRowFaults is how many faults of a field list are told one by one; the
// rest are counted.
const maxRowFaults = 1000

// readFields finds the field list and reads it.
func (l *loader) readFields(m *mapping) {
	n := m.values["fields"]
	if n == nil {
		return
	}
	name, at := "", n
	var columns map[string]*yaml.Node
	if n.Kind == yaml.MappingNode {
		fm := l.mapping(n, "fields", "fields")
		name, _ = fm.text("file", "want a file's name")
		at = fm.at("file")
		columns = fm.columns("columns")
	} else {
		name, _ = m.text("fields", "want a file's name, or {file, columns}")
	}
	if name == "" {
		return
	}
	const want = "want a .csv or .parquet file in the survey's folder"
	parquet := false
	switch strings.ToLower(filepath.Ext(name)) {
	case ".csv":
	case ".parquet":
		parquet = true
	default:
		l.fault(at, fmt.Sprintf("the field list %q is neither CSV nor Parquet", clip(name)), want)
		return
	}
	file, err := l.folder.open(filepath.FromSlash(name), MaxFieldBytes)
	if err != nil {
		l.fault(at, fmt.Sprintf("the field list %q can't be read: %v", clip(name), reason(err)), want)
		return
	}
	defer file.file.Close()
	list := &fieldList{l: l, file: filepath.Join(l.folder.source.Root, name), mapped: columns, hours: true}
	var table *rows
	if parquet {
		table, err = openParquet(file)
	} else {
		table, err = openCSV(file)
	}
	if err == nil {
		list.read(table)
	} else if errors.Is(err, io.EOF) {
		list.fault(1, "the field list is empty", "want a header line and a row for each field")
	} else {
		list.fault(1, fmt.Sprintf("it can't be read: %v", err), want)
	}
	if err := l.folder.done(file); err != nil {
		list.fault(1, fmt.Sprintf("it can't be read: %v", reason(err)), want)
	}
}

// columns reads the map from our columns to the file's, by our column.
func (m *mapping) columns(key string) map[string]*yaml.Node {
	const want = "want such as {ra_deg: RAJ2000, dec_deg: DEJ2000}"
	n := m.values[key]
	if n == nil {
		return nil
	}
	if n.Kind != yaml.MappingNode {
		m.r.fault(n, key+" is "+kindName(n), want)
		return nil
	}
	known := columnNames()
	columns := map[string]*yaml.Node{}
	for i := 0; i+1 < len(n.Content); i += 2 {
		k, v := n.Content[i], resolve(n.Content[i+1])
		ours := strings.ToLower(k.Value)
		switch {
		case ordinal(known, ours) < 0:
			m.r.fault(k, fmt.Sprintf("unknown column %q in columns", clip(k.Value)), oneOf(ours, "columns", known))
		case columns[ours] != nil:
			m.r.fault(k, fmt.Sprintf("the column %s is there twice, first on line %d", ours, columns[ours].Line), "keep one of them")
		case v.Kind != yaml.ScalarNode || isNull(v):
			m.r.fault(v, fmt.Sprintf("the column %s is %s", ours, kindName(v)), want)
		default:
			columns[ours] = v
		}
	}
	return columns
}

// columnNames are our columns, and the rules that a field may override.
func columnNames() []string {
	var all []string
	for _, s := range columnSpecs {
		all = append(all, s.Key)
	}
	for _, s := range ruleSpecs {
		all = append(all, s.key)
	}
	return all
}

// separators are what other programs write between cells in place of commas.
var separators = []struct{ mark, name string }{{";", "semicolons"}, {"\t", "tabs"}, {"|", "bars"}}

// fieldList is one field list being read.
type fieldList struct {
	l      *loader
	file   string
	mapped map[string]*yaml.Node // nil without a column map
	at     map[string]int        // our column -> place in a row
	told   int                   // faults told so far
	untold int                   // faults only counted
	lines  []int32               // of each field, for later checks
	seen   map[string]int32      // field name -> line
	base   [][]survey.Rules      // by program: each demand's rules without a field's own
	lists  map[string][]int      // telescope lists met before
	hours  bool                  // every RA so far is a plain number below 24
}

// fault notes something wrong in a row.
func (f *fieldList) fault(line int, what, want string) {
	if f.told++; f.told > maxRowFaults {
		f.untold++
		return
	}
	f.l.issues = append(f.l.issues, Issue{File: f.file, Line: max(1, line), What: what, Want: want})
}

func (f *fieldList) warn(line int, what, want string) {
	f.l.issues = append(f.l.issues, Issue{File: f.file, Line: max(1, line), What: what, Want: want, Warning: true})
}

// read reads all rows.
func (f *fieldList) read(t *rows) {
	if !f.place(t) {
		return
	}
	f.seen, f.lists = map[string]int32{}, map[string][]int{}
	f.base = f.l.demandRules()
	last, count := t.line, 0
	for {
		cells, line, err := t.next()
		if errors.Is(err, io.EOF) {
			break
		}
		last = max(last, line)
		if bad := (*rowFault)(nil); errors.As(err, &bad) {
			f.fault(line, bad.what, bad.want)
			continue
		} else if err != nil {
			f.fault(last, fmt.Sprintf("it can't be read further: %v", err), "want a whole file")
			break
		}
		if count++; count > MaxFields {
			f.fault(line, "the field list has more rows than the limit", fmt.Sprintf("want at most %d fields", MaxFields))
			break
		}
		f.row(cells, line)
	}
	if f.untold > 0 {
		f.l.issues = append(f.l.issues, Issue{File: f.file, Line: last, What: fmt.Sprintf("the field list has %d more faults", f.untold), Want: "mend those above first"})
	}
	if count == 0 && f.told == 0 {
		f.fault(t.line, "the field list has no fields", "want at least one row under the header")
	}
	if count > 1 && f.hours && f.told == 0 {
		f.warn(t.line+1, "every ra_deg is below 24, as if in hours", "want degrees, or hours such as 12:34:56.7")
	}
	f.l.checkFields(f)
}

// place finds the columns in the header.
func (f *fieldList) place(t *rows) bool {
	if len(t.header) == 1 {
		for _, s := range separators {
			if strings.Contains(t.header[0], s.mark) {
				f.fault(t.line, "the header has "+s.name+" between its words", "want commas: save the list as comma-separated values")
				return false
			}
		}
	}
	f.at = map[string]int{}
	in := map[string][]int{} // a header's word -> its places
	for i, h := range t.header {
		in[strings.ToLower(h)] = append(in[strings.ToLower(h)], i)
	}
	known, taken := columnNames(), make([]bool, len(t.header))
	for _, ours := range known {
		word := ours
		if n := f.mapped[ours]; n != nil {
			word = n.Value
		}
		places := in[strings.ToLower(word)]
		switch {
		case len(places) > 1:
			f.fault(t.line, fmt.Sprintf("the column %q is there twice", clip(word)), "want each column once")
		case len(places) == 1:
			f.at[ours] = places[0]
			taken[places[0]] = true
			continue
		case f.mapped[ours] != nil:
			f.l.fault(f.mapped[ours], fmt.Sprintf("the field list has no column %q", clip(word)), oneOf(word, "columns", t.header))
		}
	}
	whole := true
	for i := range columnSpecs {
		s := &columnSpecs[i]
		if _, there := f.at[s.Key]; there || !s.Need {
			continue
		}
		whole = false // without it no row can be judged
		if f.mapped[s.Key] == nil && len(in[s.Key]) == 0 {
			f.fault(t.line, "the field list has no column "+s.Key, "want it ("+s.About+"), or a map such as fields: {file: ..., columns: {"+s.Key+": its name}}")
		}
	}
	for i, h := range t.header {
		if taken[i] || len(in[strings.ToLower(h)]) > 1 && ordinal(known, strings.ToLower(h)) >= 0 {
			continue
		}
		near, slip := nearest(h, known)
		if _, there := f.at[near]; there || f.mapped[near] != nil {
			slip = false
		}
		switch {
		case f.mapped == nil:
			f.fault(t.line, fmt.Sprintf("unknown column %q", clip(h)), oneOf(h, "columns", known)+" (with a columns map, others are left alone)")
		case slip:
			f.warn(t.line, fmt.Sprintf("the column %q is left alone", clip(h)), fmt.Sprintf("did you mean %q?", near))
		}
	}
	return whole
}

// cell returns a column's text in a row; "" when there is none.
func (f *fieldList) cell(cells []string, column string) string {
	i, ok := f.at[column]
	if !ok {
		return ""
	}
	return strings.TrimSpace(cells[i])
}

// need is cell for a column that must not be empty.
func (f *fieldList) need(cells []string, column string, line int) (string, bool) {
	text := f.cell(cells, column)
	if text == "" {
		f.fault(line, column+" is empty", "want "+specOf(column).About)
	}
	return text, text != ""
}

func specOf(column string) *Spec {
	for i := range columnSpecs {
		if columnSpecs[i].Key == column {
			return &columnSpecs[i]
		}
	}
	return nil
}

// number reads a column with a default, in the file's unit.
func (f *fieldList) number(cells []string, column string, line int, in span, missing float64) float64 {
	text := f.cell(cells, column)
	if text == "" {
		return missing
	}
	v, err := parseNumber(text)
	switch {
	case err != nil:
		f.fault(line, fmt.Sprintf("%s: %s %s", column, strconv.Quote(clip(text)), err), in.want(plain))
		return missing
	case !in.holds(v):
		f.fault(line, fmt.Sprintf("%s is %s", column, clip(text)), in.want(plain))
		return missing
	}
	return v
}
