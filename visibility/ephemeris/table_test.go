package ephemeris

import (
	"encoding/csv"
	"math"
	"os"
	"strconv"
	"testing"
)

// csvTable is a reference table: lines from # are its source.
type csvTable struct {
	t    *testing.T
	name string
	cols map[string]int
	rows [][]string
}

// readTable reads a CSV file whose comments start with #.
func readTable(t *testing.T, path string) *csvTable {
	t.Helper()
	f, err := os.Open(path)
	if err != nil {
		t.Fatal(err)
	}
	defer f.Close()
	r := csv.NewReader(f)
	r.Comment = '#'
	rows, err := r.ReadAll()
	if err != nil {
		t.Fatalf("%s: %v", path, err)
	}
	if len(rows) < 2 {
		t.Fatalf("%s has no rows", path)
	}
	tab := &csvTable{t: t, name: path, cols: map[string]int{}, rows: rows[1:]}
	for i, c := range rows[0] {
		tab.cols[c] = i
	}
	return tab
}

// text returns a cell.
func (c *csvTable) text(row int, col string) string {
	c.t.Helper()
	i, ok := c.cols[col]
	if !ok {
		c.t.Fatalf("%s has no column %s", c.name, col)
	}
	return c.rows[row][i]
}

// num returns a cell as a number.
func (c *csvTable) num(row int, col string) float64 {
	c.t.Helper()
	v, err := strconv.ParseFloat(c.text(row, col), 64)
	if err != nil {
		c.t.Fatalf("%s row %d, %s: %v", c.name, row+1, col, err)
	}
	return v
}

// vec returns three cells.
func (c *csvTable) vec(row int, x, y, z string) Vec {
	c.t.Helper()
	return Vec{c.num(row, x), c.num(row, y), c.num(row, z)}
}

// mat returns nine cells named prefix00 to prefix22.
func (c *csvTable) mat(row int, prefix string) Mat {
	c.t.Helper()
	var m Mat
	for i := range m {
		for j := range m[i] {
			m[i][j] = c.num(row, prefix+strconv.Itoa(i)+strconv.Itoa(j))
		}
	}
	return m
}

// worst keeps the largest error and the sum of squares of named quantities.
type worst struct {
	n        int
	max, sum float64
}

func (w *worst) add(v float64) {
	w.n++
	w.sum += v * v
	w.max = math.Max(w.max, math.Abs(v))
	if math.IsNaN(v) {
		w.max = math.NaN()
	}
}

func (w *worst) rms() float64 { return math.Sqrt(w.sum / float64(w.n)) }

// check fails the test when the largest error passes the limit, or nothing
// was measured.
func (w *worst) check(t *testing.T, what string, limit float64) {
	t.Helper()
	t.Logf("%-28s rms %.3g, max %.3g (limit %.3g, n %d)", what, w.rms(), w.max, limit, w.n)
	if w.n == 0 || !(w.max <= limit) {
		t.Errorf("%s: worst error %.6g of %d, limit %.6g", what, w.max, w.n, limit)
	}
}

// apart returns the angle between two vectors, rad, good at all sizes.
func apart(a, b Vec) float64 { return math.Atan2(a.Cross(b).Norm(), a.Dot(b)) }

// angleError is the difference of two angles within half a turn.
func angleError(a, b float64) float64 { return math.Remainder(a-b, 2*math.Pi) }

const degree = math.Pi / 180
