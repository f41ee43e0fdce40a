package tables

import (
	"errors"
	"fmt"
	"io"
	"math"
	"strconv"
	"strings"

	"github.com/parquet-go/parquet-go"
)

// Column is one column of a foreign flat Parquet file.
type Column struct {
	Name string
	// Numeric columns (integers and floats) fill Number; all others fill Text
	// (text as it is, dates and instants in ISO 8601, true and false).
	Numeric bool
	Number  []float64
	Text    []string
	Null    []bool
}

// Cell returns one cell as text, numbers in shortest form; "" for null.
func (c *Column) Cell(row int) string {
	switch {
	case c.Null[row]:
		return ""
	case c.Numeric:
		return Float(c.Number[row])
	}
	return c.Text[row]
}

// Len returns the number of rows.
func (c *Column) Len() int { return len(c.Null) }

// ReadColumns reads a flat Parquet file of any schema, such as a field list
// from elsewhere. name stands in errors. A file with nested or repeated
// columns, a column type that has no plain text or number form, or more than
// maxRows rows is refused.
func ReadColumns(name string, r io.ReaderAt, size int64, maxRows int) (columns []Column, err error) {
	defer recoverDamage(name, &err)
	f, err := openParquet(name, r, size)
	if err != nil {
		return nil, err
	}
	fields := f.Schema().Fields()
	var readers []cellReader
	for _, c := range fields {
		cr, err := foreignReader(c)
		if err != nil {
			return nil, fmt.Errorf("%s: column %q %w", name, c.Name(), err)
		}
		readers = append(readers, cr)
		columns = append(columns, Column{Name: c.Name(), Numeric: cr.number != nil})
	}
	n := f.NumRows()
	if n < 0 {
		return nil, damaged(name, errRowCount)
	}
	if n > int64(maxRows) {
		return nil, fmt.Errorf("%s: it has %d rows; want at most %d", name, n, maxRows)
	}
	for _, g := range f.RowGroups() {
		for k, chunk := range g.ColumnChunks() {
			c := &columns[k]
			err := eachValue(chunk, func(v parquet.Value) error {
				if c.Len() >= int(n) {
					return errRowCount
				}
				c.add(v, readers[k])
				return nil
			})
			if err != nil {
				return nil, damaged(name, err)
			}
		}
	}
	for k := range columns {
		if int64(columns[k].Len()) != n {
			return nil, damaged(name, fmt.Errorf("column %q has %d values of %d", columns[k].Name, columns[k].Len(), n))
		}
	}
	return columns, nil
}

// cellReader turns a value into a number or a text.
type cellReader struct {
	number func(parquet.Value) float64
	text   func(parquet.Value) string
}

func (c *Column) add(v parquet.Value, cr cellReader) {
	null := v.IsNull()
	c.Null = append(c.Null, null)
	switch {
	case cr.number != nil && null:
		c.Number = append(c.Number, math.NaN())
	case cr.number != nil:
		c.Number = append(c.Number, cr.number(v))
	case null:
		c.Text = append(c.Text, "")
	default:
		c.Text = append(c.Text, cr.text(v))
	}
}

func foreignReader(f parquet.Field) (cellReader, error) {
	if !f.Leaf() || f.Repeated() {
		return cellReader{}, errors.New("is nested or a list; want flat columns only")
	}
	if l := f.Type().LogicalType(); l != nil && l.Value != nil {
		if cr, known, err := logicalReader(l); known || err != nil {
			return cr, err
		}
	}
	switch f.Type().Kind() {
	case parquet.Boolean:
		return cellReader{text: func(v parquet.Value) string { return strconv.FormatBool(v.Boolean()) }}, nil
	case parquet.Int32:
		return cellReader{number: func(v parquet.Value) float64 { return float64(v.Int32()) }}, nil
	case parquet.Int64:
		return cellReader{number: func(v parquet.Value) float64 { return float64(v.Int64()) }}, nil
	case parquet.Float:
		// By way of the shortest decimal form: 0.1 as float32 means 0.1.
		return cellReader{number: func(v parquet.Value) float64 {
			x, _ := strconv.ParseFloat(strconv.FormatFloat(float64(v.Float()), 'g', -1, 32), 64)
			return x
		}}, nil
	case parquet.Double:
		return cellReader{number: parquet.Value.Double}, nil
	case parquet.ByteArray:
		return cellReader{text: func(v parquet.Value) string { return strings.Clone(string(v.ByteArray())) }}, nil
	}
	return cellReader{}, fmt.Errorf("is of type %s; want text, numbers, true or false, dates or instants", f.Type())
}
