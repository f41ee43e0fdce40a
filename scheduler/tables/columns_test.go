package tables

import (
	"bytes"
	"math"
	"slices"
	"strings"
	"testing"
)

// listRow is a field list as another program may have written it.
type listRow struct {
	Name   string   `parquet:"name,optional"`
	RA     float64  `parquet:"ra"`
	Dec    float32  `parquet:"dec"`
	Weight *float64 `parquet:"weight,optional"`
	Count  int32    `parquet:"count"`
	Big    uint64   `parquet:"big"`
	Good   bool     `parquet:"good"`
	Day    int32    `parquet:"day,date"`
	At     int64    `parquet:"at,timestamp(millisecond:utc)"`
	Price  int64    `parquet:"price,decimal(2:18)"`
}

func TestReadColumns(t *testing.T) {
	w := 0.5
	data := foreign(t, []listRow{
		{"Ember", 10.25, -0.1, &w, -3, math.MaxUint64, true, 20878, 1800000000500, 1234},
		{"", math.Pi, 45, nil, 7, 1, false, 0, -1, -5},
	})
	columns, err := ReadColumns("list.parquet", bytes.NewReader(data), int64(len(data)), 10)
	if err != nil {
		t.Fatal(err)
	}
	var got [][]string
	for i := range columns {
		got = append(got, []string{columns[i].Name, columns[i].Cell(0), columns[i].Cell(1)})
	}
	want := [][]string{
		{"name", "Ember", ""}, {"ra", "10.25", "3.141592653589793"}, {"dec", "-0.1", "45"}, {"weight", "0.5", ""}, {"count", "-3", "7"},
		{"big", "18446744073709552000", "1"}, {"good", "true", "false"}, {"day", "2027-03-01", "1970-01-01"},
		{"at", "2027-01-15T08:00:00.5Z", "1969-12-31T23:59:59.999Z"}, {"price", "12.34", "-0.05"},
	}
	if !slices.EqualFunc(got, want, slices.Equal) {
		t.Errorf("got  %q\nwant %q", got, want)
	}
	if !columns[1].Numeric || columns[0].Numeric || !columns[3].Null[1] || !math.IsNaN(columns[3].Number[1]) || columns[3].Len() != 2 {
		t.Errorf("columns: %+v", columns)
	}
}

func TestReadColumnsReadsManyRows(t *testing.T) {
	rows := make([]listRow, 20000)
	for i := range rows {
		rows[i] = listRow{Name: strings.Repeat("x", i%5+1), RA: float64(i)}
	}
	data := foreign(t, rows)
	columns, err := ReadColumns("list.parquet", bytes.NewReader(data), int64(len(data)), len(rows))
	if err != nil || columns[1].Len() != len(rows) || columns[1].Number[19999] != 19999 || columns[0].Text[19999] != "xxxxx" {
		t.Errorf("%v", err)
	}
	if _, err := ReadColumns("list.parquet", bytes.NewReader(data), int64(len(data)), len(rows)-1); err == nil || !strings.Contains(err.Error(), "20000 rows; want at most 19999") {
		t.Errorf("too many rows: %v", err)
	}
}

func TestReadColumnsRefuses(t *testing.T) {
	type nested struct {
		At struct {
			RA float64 `parquet:"ra"`
		} `parquet:"at"`
	}
	type list struct {
		Bands []string `parquet:"bands"`
	}
	type local struct {
		At int64 `parquet:"at,timestamp(microsecond:local)"`
	}
	type clock struct {
		At int64 `parquet:"at,time(microsecond)"`
	}
	type id struct {
		ID [16]byte `parquet:"id,uuid"`
	}
	tests := []struct {
		data []byte
		want string
	}{
		{foreign(t, []nested{{}}), `column "at" is nested or a list`},
		{foreign(t, []list{{[]string{"g"}}}), `column "bands" is nested or a list`},
		{foreign(t, []local{{}}), `column "at" holds local times without a zone; want instants in UTC`},
		{foreign(t, []clock{{}}), `column "at" holds TIME`},
		{foreign(t, []id{{}}), `column "id" holds UUID`},
		{[]byte("PAR1 no, not really PAR1"), `want a whole Parquet file`},
	}
	for _, tt := range tests {
		_, err := ReadColumns("list.parquet", bytes.NewReader(tt.data), int64(len(tt.data)), 10)
		if err == nil || !strings.Contains(err.Error(), tt.want) || !strings.HasPrefix(err.Error(), "list.parquet: ") {
			t.Errorf("%v; want %q", err, tt.want)
		}
	}
}
