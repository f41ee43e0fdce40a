package surveyfile

import (
	"cmp"
	"fmt"
	"slices"
)

// Issue is one fault or one suspicion about a survey's files.
type Issue struct {
	File    string // as the caller would open it
	Line    int    // from 1; in a Parquet file the row's number, from 1
	Col     int    // from 1, in bytes of the line; 0 where the place has no column
	What    string // what is wrong
	Want    string // what would be right
	Warning bool   // a suspicion: the survey is usable all the same
}

// String is "file:line: what is wrong; what would be right".
func (i Issue) String() string {
	kind := ""
	if i.Warning {
		kind = "warning: "
	}
	s := fmt.Sprintf("%s:%d: %s%s", i.File, i.Line, kind, i.What)
	if i.Want != "" {
		s += "; " + i.Want
	}
	return s
}

// Error makes an Issue usable as an error.
func (i Issue) Error() string { return i.String() }

// Faults counts the issues that are not warnings.
func Faults(issues []Issue) int {
	n := 0
	for i := range issues {
		if !issues[i].Warning {
			n++
		}
	}
	return n
}

// sortIssues orders by file, line and column; issues of one place stay in
// the order in which they were found.
func sortIssues(issues []Issue) {
	slices.SortStableFunc(issues, func(a, b Issue) int {
		return cmp.Or(cmp.Compare(a.File, b.File), cmp.Compare(a.Line, b.Line), cmp.Compare(a.Col, b.Col))
	})
}
