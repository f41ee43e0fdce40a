package work

import (
	"bytes"
	"encoding/csv"
	"encoding/json"
	"io"

	"nightwright/scheduler/tables"
)

// WriteJSONRows writes a table as a JSON array, one object a row with the
// columns' names: the values are those of the CSV form, numbers and booleans
// bare, a missing one null.
func WriteJSONRows[T any](w io.Writer, t tables.Table[T], rows []T) error {
	var text bytes.Buffer
	if err := t.WriteCSV(&text, rows); err != nil {
		return err
	}
	r := csv.NewReader(&text)
	names, err := r.Read()
	if err != nil {
		return err
	}
	keys := make([][]byte, len(names))
	for i, n := range names {
		if keys[i], err = json.Marshal(n); err != nil {
			return err
		}
	}
	columns := forms[T]()
	var out bytes.Buffer
	out.WriteByte('[')
	for n := 0; ; n++ {
		cells, err := r.Read()
		if err == io.EOF {
			break
		}
		if err != nil {
			return err
		}
		if n > 0 {
			out.WriteByte(',')
		}
		out.WriteString("\n  {")
		for i, c := range cells {
			if i > 0 {
				out.WriteString(", ")
			}
			out.Write(keys[i])
			out.WriteString(": ")
			if err := writeCell(&out, c, columns[i]); err != nil {
				return err
			}
		}
		out.WriteByte('}')
		if out.Len() > 1<<16 {
			if _, err := out.WriteTo(w); err != nil {
				return err
			}
		}
	}
	out.WriteString("\n]\n")
	_, err = out.WriteTo(w)
	return err
}

func writeCell(out *bytes.Buffer, c string, f form) error {
	switch {
	case c == "" && f.optional:
		out.WriteString("null")
	case f.bare:
		out.WriteString(c)
	default:
		text, err := json.Marshal(c)
		out.Write(text)
		return err
	}
	return nil
}
