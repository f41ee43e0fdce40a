package ledger

import (
	"cmp"
	"fmt"
	"slices"
	"strings"
)

// Fault is one thing wrong with a file of rows.
type Fault struct {
	File string // as it was named
	Line int    // from 1
	What string // what is wrong
	Want string // what would be right
}

// String is "file:line: what is wrong; what would be right".
func (f Fault) String() string { return fmt.Sprintf("%s:%d: %s; %s", f.File, f.Line, f.What, f.Want) }

// MaxFaults is the most faults that are told one by one; what is over is
// counted in a last one.
const MaxFaults = 1000

// faults gathers the faults of one file.
type faults struct {
	file string
	list []Fault
	more int
}

func (f *faults) add(line int, want, what string, args ...any) {
	if len(f.list) == MaxFaults {
		f.more++
		return
	}
	f.list = append(f.list, Fault{f.file, line, fmt.Sprintf(what, args...), want})
}

// all returns the faults by line.
func (f *faults) all() []Fault {
	slices.SortStableFunc(f.list, func(a, b Fault) int { return cmp.Compare(a.Line, b.Line) })
	if f.more > 0 {
		last := f.list[len(f.list)-1].Line
		return append(f.list, Fault{f.file, last, fmt.Sprintf("there are %d more faults", f.more), "mend those above first"})
	}
	return f.list
}

// quoted shows a cell in a message: quoted, and not endless.
func quoted(cell string) string {
	const most = 60
	if r := []rune(cell); len(r) > most {
		cell = string(r[:most]) + "..."
	}
	return fmt.Sprintf("%q", cell)
}

// listed says which names there are, or the nearest to what was given.
func listed(name string, names []string) string {
	if near, ok := nearest(name, names); ok {
		return fmt.Sprintf("did you mean %q?", near)
	}
	const most = 8
	if len(names) > most {
		return fmt.Sprintf("want one of %s and %d more", strings.Join(names[:most], ", "), len(names)-most)
	}
	return "want one of " + strings.Join(names, ", ")
}

// nearest returns the name that differs from word in case alone, or in one
// letter put in, taken out or changed; of several the first.
func nearest(word string, names []string) (string, bool) {
	for _, n := range names {
		if strings.EqualFold(word, n) {
			return n, true
		}
	}
	if len(word) < 3 {
		return "", false
	}
	for _, n := range names {
		if oneApart(strings.ToLower(word), strings.ToLower(n)) {
			return n, true
		}
	}
	return "", false
}

// oneApart reports whether one edit makes one word of the other, or a swap of
// neighbours.
func oneApart(a, b string) bool {
	x, y := []rune(a), []rune(b)
	if len(x) > len(y) {
		x, y = y, x
	}
	if len(y)-len(x) > 1 {
		return false
	}
	k := 0
	for k < len(x) && x[k] == y[k] {
		k++
	}
	if len(x) < len(y) {
		return slices.Equal(x[k:], y[k+1:])
	}
	if k >= len(x)-1 || slices.Equal(x[k+1:], y[k+1:]) {
		return true
	}
	return x[k] == y[k+1] && x[k+1] == y[k] && slices.Equal(x[k+2:], y[k+2:])
}
