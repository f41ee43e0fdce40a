package main

import (
	"encoding/csv"
	"io"
	"path/filepath"
	"strings"

	"github.com/google/renameio/v2"

	"nightwright/cmd/nightwright/work"
	"nightwright/scheduler/tables"
)

// tableFlags say where a table goes and in which form.
type tableFlags struct {
	out   string
	asCSV bool
}

// maxListRows is the most rows that a table on the terminal has.
const maxListRows = 5000

// show writes a table: to --out as Parquet or CSV, or to stdout as CSV, JSON
// or in columns.
func show[T any](a *app, t tables.Table[T], rows []T, f tableFlags) error {
	switch {
	case f.out != "":
		return writeTable(a, t, rows, f)
	case f.asCSV:
		return t.WriteCSV(a.stdout, rows)
	case a.asJSON:
		return work.WriteJSONRows(a.stdout, t, rows)
	case len(rows) > maxListRows:
		return work.Inputf("the table has %s rows, too many to read; use --csv, --json or --out FILE.parquet", thousands(len(rows)))
	}
	return a.listTable(func(w io.Writer) error { return t.WriteCSV(w, rows) })
}

func writeTable[T any](a *app, t tables.Table[T], rows []T, f tableFlags) error {
	if f.asCSV || strings.EqualFold(filepath.Ext(f.out), ".csv") {
		w, err := renameio.NewPendingFile(f.out, renameio.WithPermissions(0o644))
		if err != nil {
			return err
		}
		defer w.Cleanup()
		if err := t.WriteCSV(w, rows); err != nil {
			return err
		}
		if err := w.CloseAtomicallyReplace(); err != nil {
			return err
		}
	} else if err := t.WriteFile(f.out, rows); err != nil {
		return err
	}
	a.note("wrote %s: %s", f.out, count(len(rows), "row"))
	if a.asJSON {
		return a.json(map[string]any{"table": t.Name, "file": f.out, "rows": len(rows)})
	}
	return nil
}

// listTable shows the CSV form of a table in columns.
func (a *app) listTable(write func(io.Writer) error) error {
	r, w := io.Pipe()
	go func() { w.CloseWithError(write(w)) }()
	defer r.Close()
	cr := csv.NewReader(r)
	head, err := cr.Read()
	if err != nil {
		return err
	}
	l := newList()
	for _, h := range head {
		if leftColumn(h) {
			h = "<" + h
		}
		l.titles = append(l.titles, h)
	}
	for {
		cells, err := cr.Read()
		if err == io.EOF {
			break
		}
		if err != nil {
			return err
		}
		for i := range cells {
			cells[i] = readable(head[i], cells[i])
		}
		l.add(cells...)
	}
	p := a.printer()
	p.table(l)
	return p.flush()
}

// leftColumn is true for columns of names and instants.
func leftColumn(name string) bool {
	switch name {
	case "site", "field", "telescope", "program", "demand", "filter", "state", "blocked_by", "night", "limited_by":
		return true
	}
	return strings.HasSuffix(name, "_utc")
}
