package footprint

import (
	"bytes"
	"encoding/csv"
	"errors"
	"fmt"
	"io"
	"path/filepath"
	"slices"
	"strconv"
	"strings"

	"go.yaml.in/yaml/v3"

	"nightwright/scenarios/surveyfile"
)

// weightColumns are the columns of a table of weights.
var weightColumns = []string{"ra_deg", "dec_deg", "radius_deg", "weight"}

// weights reads a table of weights.
func (r *reader) weights(n *yaml.Node) []WeightCircle {
	want := "want a CSV file in the region file's folder with the columns " + strings.Join(weightColumns, ",")
	if n.Kind != yaml.ScalarNode {
		r.fault(n, "weights is "+show(n), want)
		return nil
	}
	text, err := r.open(n.Value, MaxRegionBytes)
	if err != nil {
		r.fault(n, fmt.Sprintf("the table %q can't be read: %v", clip(n.Value), bare(err)), want)
		return nil
	}
	file := filepath.Join(filepath.Dir(r.file), n.Value)
	tell := func(line int, what, want string) {
		r.issues = append(r.issues, surveyfile.Issue{File: file, Line: max(1, line), What: what, Want: want})
	}
	c := csv.NewReader(bytes.NewReader(text))
	c.FieldsPerRecord = -1
	var out []WeightCircle
	for first := true; ; first = false {
		row, err := c.Read()
		if errors.Is(err, io.EOF) {
			break
		}
		if err != nil {
			var bad *csv.ParseError
			if errors.As(err, &bad) {
				tell(bad.Line, fmt.Sprintf("it is not CSV here: %v", bad.Err), want)
			}
			return nil
		}
		line, _ := c.FieldPos(0)
		if first {
			if !slices.Equal(row, weightColumns) {
				tell(line, fmt.Sprintf("the header is %q", clip(strings.Join(row, ","))), "want "+strings.Join(weightColumns, ","))
				return nil
			}
			continue
		}
		if len(row) != 4 {
			tell(line, fmt.Sprintf("the row has %d cells", len(row)), "want 4")
			continue
		}
		var v [4]float64
		low, high := [4]float64{-360, -90, 0, 0}, [4]float64{360, 90, 180, 1e9}
		sound := true
		for k, cell := range row {
			x, err := strconv.ParseFloat(strings.TrimSpace(cell), 64)
			if err != nil || !(x >= low[k] && x <= high[k]) {
				tell(line, fmt.Sprintf("%s is %q", weightColumns[k], clip(cell)), fmt.Sprintf("want %g to %g", low[k], high[k]))
				sound = false
			}
			v[k] = x
		}
		if sound {
			out = append(out, WeightCircle{Circle{Direction(v[0]*degree, v[1]*degree), v[2] * degree}, v[3]})
		}
	}
	return out
}
