package work

import (
	"errors"
	"io"
	"io/fs"
	"strings"

	"nightwright/scheduler/tables"
)

// ReadPlan reads a plan folder. A folder that is missing, damaged or of
// another version is the input's fault.
func ReadPlan(dir string) (*tables.PlanTables, error) {
	pt, err := tables.ReadFolder(dir)
	if err == nil {
		return pt, nil
	}
	if errors.Is(err, fs.ErrNotExist) {
		return nil, Inputf("%v; want a plan folder, as 'nightwright plan SURVEY' writes it", err)
	}
	return nil, &InputError{What: err.Error()}
}

// Changed lists the files of a survey that differ from those a plan was made
// from.
func (s *Survey) Changed(pt *tables.PlanTables) []string {
	old := map[string]string{}
	for _, f := range pt.Summary.Files {
		old[f.Name] = f.SHA256
	}
	var out []string
	for _, f := range s.Source.Files {
		if old[f.Name] != f.SHA256 {
			out = append(out, f.Name)
		}
	}
	return out
}

// exports lists the tables of a plan that can be exported, visits first.
var exports = []struct {
	name  string
	write func(w io.Writer, pt *tables.PlanTables) error
}{
	{tables.Visits.Name, func(w io.Writer, pt *tables.PlanTables) error { return tables.Visits.WriteCSV(w, pt.Visits) }},
	{tables.Fields.Name, func(w io.Writer, pt *tables.PlanTables) error { return tables.Fields.WriteCSV(w, pt.Fields) }},
	{tables.Demands.Name, func(w io.Writer, pt *tables.PlanTables) error { return tables.Demands.WriteCSV(w, pt.Demands) }},
	{tables.Nights.Name, func(w io.Writer, pt *tables.PlanTables) error { return tables.Nights.WriteCSV(w, pt.Nights) }},
	{tables.Prices.Name, func(w io.Writer, pt *tables.PlanTables) error { return tables.Prices.WriteCSV(w, pt.Prices) }},
}

// ExportNames lists the tables that ExportCSV knows.
func ExportNames() []string {
	var names []string
	for _, e := range exports {
		names = append(names, e.name)
	}
	return names
}

// ExportCSV writes one table of a plan as CSV.
func ExportCSV(w io.Writer, pt *tables.PlanTables, table string) error {
	for _, e := range exports {
		if e.name == table {
			return e.write(w, pt)
		}
	}
	return Inputf("there is no table %q; there are %s", table, strings.Join(ExportNames(), ", "))
}
