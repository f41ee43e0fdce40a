package work

import (
	"io"
	"strings"
	"time"

	"nightwright/constraints/survey"
	"nightwright/scenarios/formats"
	"nightwright/scheduler/tables"
)

// ExportOptions say what to write of a plan.
type ExportOptions struct {
	As    string // one of ExportFormats
	Table string // one of ExportNames, for formats that hold any table; "" is the visits
	Stamp string // an instant or date for formats that want one; "" is the plan's own
	JSON  bool   // a MOC as JSON instead of ASCII
}

// exportFormats are the formats, and whether they hold any table of a plan.
var exportFormats = []struct {
	name     string
	anyTable bool
}{{"csv", true}, {"ecsv", true}, {"votable", true}, {"ical", false}, {"obsloctap", false}, {"moc", false}}

// ExportFormats lists the formats that Export knows.
func ExportFormats() []string {
	var names []string
	for _, f := range exportFormats {
		names = append(names, f.name)
	}
	return names
}

// Export writes a plan, or a table of it, in a format. Nothing but the plan
// folder is read. Options that don't fit are the input's fault.
func Export(w io.Writer, dir string, o ExportOptions) error {
	anyTable, known := false, false
	for _, f := range exportFormats {
		if f.name == o.As {
			anyTable, known = f.anyTable, true
		}
	}
	switch {
	case !known:
		return Inputf("--as is %q; want one of %s", o.As, strings.Join(ExportFormats(), ", "))
	case !anyTable && o.Table != "":
		return Inputf("--as %s is made of the whole plan; leave --table out", o.As)
	case o.Stamp != "" && o.As != "ical" && o.As != "obsloctap":
		return Inputf("--as %s has no place for a stamp; leave --stamp out", o.As)
	case o.JSON && o.As != "moc":
		return Inputf("--json goes with --as moc; leave it out")
	}
	pt, err := ReadPlan(dir)
	if err != nil {
		return err
	}
	if o.Table == "" {
		o.Table = tables.Visits.Name
	}
	switch o.As {
	case "csv":
		return ExportCSV(w, pt, o.Table)
	case "ecsv", "votable":
		t, err := exportTable(pt, o.Table)
		if err != nil {
			return err
		}
		if o.As == "ecsv" {
			return formats.WriteECSV(w, t, formats.Infos(pt))
		}
		return formats.WriteVOTable(w, formats.Document{About: "A table of a survey plan", Infos: formats.Infos(pt), Table: t})
	}
	p, err := openPlan(dir, pt, o.Stamp)
	if err != nil {
		return err
	}
	switch o.As {
	case "ical":
		return formats.WriteCalendar(w, p)
	case "obsloctap":
		infos := append([]formats.Info{{Name: "QUERY_STATUS", Value: "OK"}}, formats.Infos(pt)...)
		return formats.WriteVOTable(w, formats.Document{About: "Planned observations, ObsLocTAP 1.0", Infos: infos, Table: formats.ObsPlan(p)})
	}
	m := formats.Coverage(p)
	text := m.ASCII()
	if o.JSON {
		text = m.JSON()
	}
	_, err = w.Write(text)
	return err
}

// exportTable makes one table of a plan ready for any format.
func exportTable(pt *tables.PlanTables, name string) (formats.Table, error) {
	switch name {
	case tables.Visits.Name:
		return formats.FromRows(tables.Visits, pt.Visits), nil
	case tables.Fields.Name:
		return formats.FromRows(tables.Fields, pt.Fields), nil
	case tables.Demands.Name:
		return formats.FromRows(tables.Demands, pt.Demands), nil
	case tables.Nights.Name:
		return formats.FromRows(tables.Nights, pt.Nights), nil
	case tables.Prices.Name:
		return formats.FromRows(tables.Prices, pt.Prices), nil
	}
	return formats.Table{}, Inputf("there is no table %q; there are %s", name, strings.Join(ExportNames(), ", "))
}

// openPlan reads the survey that a plan folder keeps.
func openPlan(dir string, pt *tables.PlanTables, stamp string) (formats.Plan, error) {
	p := formats.Plan{Tables: pt}
	ok := true
	if p.Stamp, ok = formats.DefaultStamp(pt); !ok {
		return p, Inputf("%s: its first night %q is no date; want the plan as it was written", dir, pt.Summary.FirstNight)
	}
	if stamp != "" {
		at, err := parseStamp(stamp)
		if err != nil {
			return p, err
		}
		p.Stamp = at
	}
	sv, err := planSurvey(dir)
	if err != nil {
		return p, err
	}
	p.Survey = sv.Survey
	return p, nil
}

// parseStamp reads an instant or a date as UTC Unix microseconds.
func parseStamp(text string) (int64, error) {
	if day, err := survey.ParseDay(text); err == nil {
		return int64(day) * 86400 * 1e6, nil
	}
	t, err := time.Parse(time.RFC3339Nano, text)
	if err != nil || t.Year() < 1972 || t.Year() > 2199 {
		return 0, Inputf("--stamp is %q; want an instant such as 2027-02-01T12:00:00Z, or a date", text)
	}
	return t.UnixMicro(), nil
}
