package main

import (
	"bytes"
	"encoding/csv"
	"encoding/json"
	"math"
	"os"
	"slices"

	"github.com/rogpeppe/go-internal/testscript"

	"nightwright/scheduler/ledger"
)

// scriptMark does to a sheet what people do: done over planned. A table without
// a column kind gets one.
func scriptMark(ts *testscript.TestScript, neg bool, args []string) {
	if neg || len(args) < 3 || len(args) > 4 {
		ts.Fatalf("usage: mark FILE OUT WORD [COLUMN]")
	}
	rows, err := csv.NewReader(bytes.NewReader([]byte(ts.ReadFile(args[0])))).ReadAll()
	ts.Check(err)
	empty := -1
	if len(args) == 4 {
		if empty = slices.Index(rows[0], args[3]); empty < 0 {
			ts.Fatalf("%s has no column %s", args[0], args[3])
		}
	}
	kind := slices.Index(rows[0], "kind")
	var out bytes.Buffer
	w := csv.NewWriter(&out)
	for i, r := range rows {
		word := args[2]
		if i == 0 {
			word = "kind"
		} else if empty >= 0 {
			r[empty] = ""
		}
		switch {
		case kind < 0:
			r = append(r, word)
		case i > 0 && r[kind] == "planned":
			r[kind] = word
		}
		ts.Check(w.Write(r))
	}
	w.Flush()
	ts.Check(w.Error())
	ts.Check(os.WriteFile(ts.MkAbs(args[1]), out.Bytes(), 0o644))
}

// scriptWorth holds the qualities that the ledger computes against those of the
// plan's tables: done as planned, visits are worth what was planned.
func scriptWorth(ts *testscript.TestScript, neg bool, args []string) {
	if neg || len(args) != 0 {
		ts.Fatalf("usage: worth")
	}
	var got struct {
		All ledger.Tally `json:"all"`
	}
	ts.Check(json.Unmarshal([]byte(ts.ReadFile("stdout")), &got))
	if a := got.All; a.PlannedCredit < 0.1 || math.Abs(a.DoneCredit-a.PlannedCredit) > 1e-9 {
		ts.Fatalf("done as planned is worth %.12f; the plan says %.12f", a.DoneCredit, a.PlannedCredit)
	}
}
