package tables

import (
	"bytes"
	"slices"
	"testing"
)

// FuzzDecode: no bytes make the strict reader panic, and what it takes for a
// table can be written and read again.
func FuzzDecode(f *testing.F) {
	for _, n := range []int{0, 1, 20} {
		data, err := Prices.Encode(sampleRows[PriceRow](n))
		if err != nil {
			f.Fatal(err)
		}
		f.Add(data)
	}
	f.Add([]byte("PAR1\x00\x00\x00\x00PAR1"))
	f.Fuzz(func(t *testing.T, data []byte) {
		rows, err := Prices.Decode("fuzz", data)
		if err != nil {
			return
		}
		again, err := Prices.Encode(rows)
		if err != nil {
			t.Fatal(err)
		}
		if got, err := Prices.Decode("again", again); err != nil || len(got) != len(rows) {
			t.Fatalf("%d rows came back as %d (%v)", len(rows), len(got), err)
		}
	})
}

// FuzzReadColumns: no bytes make the reader of foreign lists panic, and its
// columns are of one length.
func FuzzReadColumns(f *testing.F) {
	data, err := Almanac.Encode(sampleRows[AlmanacRow](3))
	if err != nil {
		f.Fatal(err)
	}
	f.Add(data)
	f.Fuzz(func(t *testing.T, data []byte) {
		columns, err := ReadColumns("fuzz", bytes.NewReader(data), int64(len(data)), 1000)
		if err != nil {
			return
		}
		for i := range columns {
			c := &columns[i]
			if c.Len() != columns[0].Len() {
				t.Fatalf("column %q has %d rows; want %d", c.Name, c.Len(), columns[0].Len())
			}
			for k := range c.Len() {
				c.Cell(k)
			}
		}
	})
}

// FuzzDecodeSummary: only what Encode writes is read.
func FuzzDecodeSummary(f *testing.F) {
	text, err := tinyPlan().Summary.Encode()
	if err != nil {
		f.Fatal(err)
	}
	f.Add(text)
	f.Add([]byte("{}"))
	f.Fuzz(func(t *testing.T, text []byte) {
		s, err := DecodeSummary("fuzz", slices.Clone(text))
		if err != nil {
			return
		}
		if again, err := s.Encode(); err != nil || !bytes.Equal(again, text) {
			t.Fatalf("read, but written otherwise (%v)", err)
		}
	})
}
