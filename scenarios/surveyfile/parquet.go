package surveyfile

import (
	"errors"
	"io"

	"nightwright/scheduler/tables"
)

// openParquet reads a Parquet field list. Its lines are the numbers of its
// rows, from 1.
func openParquet(r *sourceReader) (*rows, error) {
	info, err := r.file.Stat()
	if err != nil {
		return nil, err
	}
	// One row more than the limit may pass, for the reader of rows to refuse.
	columns, err := tables.ReadColumns(r.name, r.file, info.Size(), MaxFields+1)
	if err != nil {
		return nil, err
	}
	if len(columns) == 0 {
		return nil, errors.New("it has no columns")
	}
	t := &rows{line: 1}
	for i := range columns {
		t.header = append(t.header, columns[i].Name)
	}
	row, cells := 0, make([]string, len(columns))
	t.next = func() ([]string, int, error) {
		if row == columns[0].Len() {
			return nil, 0, io.EOF
		}
		for i := range columns {
			cells[i] = columns[i].Cell(row)
		}
		row++
		return cells, row, nil
	}
	return t, nil
}
