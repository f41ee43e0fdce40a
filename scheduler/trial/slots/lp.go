package slots

import (
	"bufio"
	"fmt"
	"io"
	"strconv"
)

// scale multiplies the objective, so that a solver's tolerances are small
// against it: coverages are small numbers.
const scale = 1000

// Width is the number of columns, those of the bonuses included.
func (pr *Program) Width() int { return len(pr.Columns) + len(pr.Bonus) }

// worth is a column's part of the objective, C.
func (pr *Program) worth(i int) float64 {
	if i < len(pr.Columns) {
		return pr.Columns[i].Value
	}
	return pr.Bonus[i-len(pr.Columns)]
}

// Write writes the programme in the LP format that CPLEX made common
// (glpsol --lp and cbc read it): its linear relaxation, or with whole columns.
// Columns are x1, x2, ...; the objective is in thousandths of coverage.
func (pr *Program) Write(to io.Writer, relaxed bool) error {
	w := bufio.NewWriter(to)
	number := func(x float64) string { return strconv.FormatFloat(x, 'g', -1, 64) }
	fmt.Fprintf(w, "Maximize\n worth:")
	for i := range pr.Width() {
		fmt.Fprintf(w, " + %s x%d\n", number(scale*pr.worth(i)), i+1)
	}
	fmt.Fprintf(w, "Subject To\n")
	for i, r := range pr.Rows {
		fmt.Fprintf(w, " r%d:", i+1)
		for k, t := range r.Terms {
			sign := "+"
			f := t.Factor
			if f < 0 {
				sign, f = "-", -f
			}
			fmt.Fprintf(w, " %s %s x%d", sign, number(f), t.Column+1)
			if k%8 == 7 {
				fmt.Fprintln(w)
			}
		}
		fmt.Fprintf(w, " <= %s\n", number(r.Most))
	}
	fmt.Fprintf(w, "Bounds\n")
	for i := range pr.Width() {
		fmt.Fprintf(w, " 0 <= x%d <= 1\n", i+1)
	}
	if !relaxed {
		fmt.Fprintf(w, "General\n")
		for i := range pr.Width() {
			fmt.Fprintf(w, " x%d\n", i+1)
		}
	}
	fmt.Fprintf(w, "End\n")
	return w.Flush()
}
