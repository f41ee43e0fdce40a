package tables

import (
	"bufio"
	"encoding/csv"
	"fmt"
	"io"
	"math"
	"reflect"
	"strconv"
	"strings"
	"time"
)

// Float writes a number in the shortest decimal form that reads back as the
// same float64; exponents only where JSON has them by custom, below 1e-6 and
// from 1e21 on.
func Float(x float64) string {
	format := byte('f')
	if a := math.Abs(x); a != 0 && (a < 1e-6 || a >= 1e21) {
		format = 'e'
	}
	return strconv.FormatFloat(x, format, -1, 64)
}

// Instant writes UTC Unix microseconds as RFC 3339 with Z and as many
// decimals of the second as needed.
func Instant(micros int64) string {
	return time.UnixMicro(micros).UTC().Format(time.RFC3339Nano)
}

// Date writes days since 1970-01-01 as YYYY-MM-DD.
func Date(day int32) string {
	return time.Unix(int64(day)*86400, 0).UTC().Format(time.DateOnly)
}

// cell writes one value of a row; null is "".
type cell func(row reflect.Value) string

// cells returns the columns of a row type and how each is written.
func cells(row reflect.Type) (names []string, out []cell) {
	for i := range row.NumField() {
		tag := strings.Split(row.Field(i).Tag.Get("parquet"), ",")
		names = append(names, tag[0])
		write := writerOf(row.Field(i).Type, tag[1:])
		optional := hasFlag(tag[1:], "optional")
		out = append(out, func(v reflect.Value) string {
			x := v.Field(i)
			if optional && x.IsZero() {
				return ""
			}
			return write(x)
		})
	}
	return names, out
}

func writerOf(t reflect.Type, flags []string) func(reflect.Value) string {
	switch {
	case t.Kind() == reflect.Pointer:
		inner := writerOf(t.Elem(), flags)
		return func(v reflect.Value) string { return inner(v.Elem()) }
	case t.Kind() == reflect.Int64 && hasFlag(flags, "timestamp"):
		return func(v reflect.Value) string { return Instant(v.Int()) }
	case t.Kind() == reflect.Int32 && hasFlag(flags, "date"):
		return func(v reflect.Value) string { return Date(int32(v.Int())) }
	case t.Kind() == reflect.Int64:
		return func(v reflect.Value) string { return strconv.FormatInt(v.Int(), 10) }
	case t.Kind() == reflect.Float64:
		return func(v reflect.Value) string { return Float(v.Float()) }
	case t.Kind() == reflect.Bool:
		return func(v reflect.Value) string { return strconv.FormatBool(v.Bool()) }
	case t.Kind() == reflect.String:
		return func(v reflect.Value) string { return v.String() }
	}
	panic(fmt.Sprintf("tables: no text form for a column of %s", t))
}

func hasFlag(flags []string, name string) bool {
	for _, f := range flags {
		if f == name || strings.HasPrefix(f, name+"(") {
			return true
		}
	}
	return false
}

// Columns returns the names of the table's columns.
func (t Table[T]) Columns() []string {
	names, _ := cells(reflect.TypeFor[T]())
	return names
}

// WriteCSV writes the same columns as CSV (RFC 4180, lines end with LF):
// instants in RFC 3339 with Z, dates YYYY-MM-DD, numbers in shortest form,
// null as nothing.
func (t Table[T]) WriteCSV(w io.Writer, rows []T) error {
	buffered := bufio.NewWriterSize(w, 1<<16)
	cw := csv.NewWriter(buffered)
	names, columns := cells(reflect.TypeFor[T]())
	if err := cw.Write(names); err != nil {
		return fmt.Errorf("%s: %w", t.Name, err)
	}
	record := make([]string, len(columns))
	rows = t.sorted(rows)
	for i := range rows {
		v := reflect.ValueOf(&rows[i]).Elem()
		for k, c := range columns {
			record[k] = c(v)
		}
		if err := cw.Write(record); err != nil {
			return fmt.Errorf("%s: %w", t.Name, err)
		}
	}
	cw.Flush()
	if err := cw.Error(); err != nil {
		return fmt.Errorf("%s: %w", t.Name, err)
	}
	return buffered.Flush()
}
