package surveyfile

import (
	"bufio"
	"bytes"
	"encoding/csv"
	"errors"
	"fmt"
	"io"
	"strings"
)

// rows is a field list being read: its header, then a row at a time.
type rows struct {
	header []string
	line   int // of the header
	// next returns a row's cells, valid until the next call, and its line.
	// After the last row the error is io.EOF; a *rowFault concerns one row;
	// any other error ends the reading.
	next func() (cells []string, line int, err error)
}

// rowFault is something wrong with one row as a whole.
type rowFault struct{ what, want string }

func (f *rowFault) Error() string { return f.what }

// openCSV reads comma-separated values as RFC 4180 has them, with LF or CRLF,
// with or without a byte-order mark.
func openCSV(r io.Reader) (*rows, error) {
	buffered := bufio.NewReaderSize(r, 1<<16)
	if mark, err := buffered.Peek(3); err == nil && bytes.Equal(mark, []byte("\ufeff")) {
		buffered.Discard(3)
	}
	c := csv.NewReader(buffered)
	c.ReuseRecord = true
	c.FieldsPerRecord = -1 // counted below, so that the reading goes on
	c.TrimLeadingSpace = true
	header, err := c.Read()
	if err != nil {
		return nil, err
	}
	t := &rows{line: 1}
	for _, h := range header {
		t.header = append(t.header, strings.Clone(strings.TrimSpace(h)))
	}
	t.line, _ = c.FieldPos(0)
	t.next = func() ([]string, int, error) {
		cells, err := c.Read()
		var bad *csv.ParseError
		switch {
		case errors.As(err, &bad):
			return nil, bad.StartLine, quoteFault(bad)
		case err != nil:
			return nil, 0, err
		}
		line, _ := c.FieldPos(0)
		if len(cells) != len(t.header) {
			return nil, line, &rowFault{fmt.Sprintf("the row has %d cells", len(cells)), fmt.Sprintf("want %d, as many as there are columns", len(t.header))}
		}
		return cells, line, nil
	}
	return t, nil
}

// quoteFault says what is wrong with the quotes of a row.
func quoteFault(bad *csv.ParseError) *rowFault {
	const want = "want cells with commas between, quoted whole or not at all; a quote inside quotes is written twice"
	switch {
	case errors.Is(bad.Err, csv.ErrQuote) && bad.Line > bad.StartLine:
		return &rowFault{"a quote that opens in this row is never closed", want}
	case errors.Is(bad.Err, csv.ErrQuote):
		return &rowFault{"a quote is closed in the middle of a cell, or not at all", want}
	case errors.Is(bad.Err, csv.ErrBareQuote):
		return &rowFault{"a quote stands in a cell that doesn't begin with one", want}
	}
	return &rowFault{"the row is no CSV: " + bad.Err.Error(), want}
}
