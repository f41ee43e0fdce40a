package tables

import (
	"bytes"
	"flag"
	"fmt"
	"math"
	"os"
	"path/filepath"
	"reflect"
	"slices"
	"strings"
	"testing"

	"github.com/google/go-cmp/cmp"
	"github.com/parquet-go/parquet-go"
	"pgregory.net/rapid"
)

var update = flag.Bool("update", false, "rewrite testdata/schemas.txt; look at the difference before you commit it")

// kind is a table with its row type hidden, so that one test serves all.
type kind struct {
	name    string
	columns []string
	schema  *parquet.Schema
	// trip draws rows, writes and reads them, and fails where they differ.
	trip func(t *rapid.T)
	// sample encodes n plain rows.
	sample func(n int) []byte
	decode func(name string, data []byte) (int, error)
}

func kindOf[T any](t Table[T]) kind {
	draw := rapid.Custom(func(rt *rapid.T) T {
		var row T
		v := reflect.ValueOf(&row).Elem()
		for i := range v.NumField() {
			drawInto(rt, v.Field(i), v.Type().Field(i).Name)
		}
		return row
	})
	return kind{
		name: t.Name, columns: t.Columns(), schema: parquet.SchemaOf(new(T)),
		trip: func(rt *rapid.T) {
			rows := rapid.SliceOfN(draw, 0, 15).Draw(rt, "rows")
			data, err := t.Encode(rows)
			if err != nil {
				rt.Fatal(err)
			}
			again, err := t.Encode(slices.Clone(rows))
			if err != nil || !bytes.Equal(data, again) {
				rt.Fatalf("two writes differ (%v)", err)
			}
			got, err := t.Decode("it", data)
			if err != nil {
				rt.Fatal(err)
			}
			want := slices.Clone(rows)
			t.Sort(want)
			if !slices.IsSortedFunc(got, func(a, b T) int { return t.Compare(&a, &b) }) || len(got) != len(want) {
				rt.Fatalf("%d rows, or not sorted; want %d sorted", len(got), len(want))
			}
			for i := range want {
				if !reflect.DeepEqual(got[i], want[i]) {
					rt.Fatalf("row %d: %+v; want %+v", i, got[i], want[i])
				}
			}
		},
		sample: func(n int) []byte {
			data, err := t.Encode(sampleRows[T](n))
			if err != nil {
				panic(err)
			}
			return data
		},
		decode: func(name string, data []byte) (int, error) {
			rows, err := t.Decode(name, data)
			return len(rows), err
		},
	}
}

// sampleRows makes rows of plain values that differ from row to row.
func sampleRows[T any](n int) []T {
	rows := make([]T, n)
	for k := range rows {
		v := reflect.ValueOf(&rows[k]).Elem()
		for i := range v.NumField() {
			x := v.Field(i)
			if x.Kind() == reflect.Pointer {
				x.Set(reflect.New(x.Type().Elem()))
				x = x.Elem()
			}
			switch x.Kind() {
			case reflect.String:
				x.SetString(fmt.Sprintf("word %d", k%7))
			case reflect.Float64:
				x.SetFloat(float64(k) + float64(i)/100)
			case reflect.Bool:
				x.SetBool(k%3 == 0)
			default:
				x.SetInt(int64(20000 + 10*k + i))
			}
		}
	}
	return rows
}

func drawInto(rt *rapid.T, v reflect.Value, name string) {
	switch v.Kind() {
	case reflect.Pointer:
		if rapid.Bool().Draw(rt, name+" there") {
			v.Set(reflect.New(v.Type().Elem()))
			drawInto(rt, v.Elem(), name)
		}
	case reflect.String:
		v.SetString(rapid.String().Draw(rt, name))
	case reflect.Float64:
		v.SetFloat(rapid.Float64().Draw(rt, name))
	case reflect.Bool:
		v.SetBool(rapid.Bool().Draw(rt, name))
	case reflect.Int32:
		v.SetInt(int64(rapid.Int32().Draw(rt, name)))
	case reflect.Int64:
		v.SetInt(rapid.Int64().Draw(rt, name))
	default:
		rt.Fatalf("no draw for %s", v.Kind())
	}
}

func kinds() []kind {
	return []kind{kindOf(Visits), kindOf(Fields), kindOf(Demands), kindOf(Nights), kindOf(Prices), kindOf(Changes), kindOf(Grid), kindOf(Almanac),
		kindOf(Parts), kindOf(Seasons), kindOf(Bands), kindOf(Chances), kindOf(Networks), kindOf(Pairs), kindOf(Worths), kindOf(Strengths)}
}

// TestSchemas holds the printed schemas against testdata/schemas.txt, which
// scripts outside rely on.
func TestSchemas(t *testing.T) {
	var b strings.Builder
	for _, k := range kinds() {
		fmt.Fprintf(&b, "%s\n", k.name)
		for _, f := range k.schema.Fields() {
			fmt.Fprintf(&b, "  %s\n", columnText(f))
		}
	}
	name := filepath.Join("testdata", "schemas.txt")
	if *update {
		if err := os.WriteFile(name, []byte(b.String()), 0o644); err != nil {
			t.Fatal(err)
		}
	}
	want, err := os.ReadFile(name)
	if err != nil {
		t.Fatal(err)
	}
	if d := cmp.Diff(string(want), b.String()); d != "" {
		t.Errorf("schemas (-golden +now); raise SchemaVersion with a change that is meant:\n%s", d)
	}
}

func TestRoundTrip(t *testing.T) {
	for _, k := range kinds() {
		t.Run(k.name, func(t *testing.T) { rapid.Check(t, k.trip) })
	}
}

// TestManyRows crosses the writer's chunks and the reader's pages.
func TestManyRows(t *testing.T) {
	for _, n := range []int{writeChunk - 1, writeChunk, writeChunk + 1, 3*writeChunk + 7} {
		rows := sampleRows[VisitRow](n)
		data, err := Visits.Encode(rows)
		if err != nil {
			t.Fatal(err)
		}
		got, err := Visits.Decode("visits", data)
		if err != nil || !reflect.DeepEqual(got, rows) {
			t.Errorf("%d rows: %d came back (%v)", n, len(got), err)
		}
	}
}

func TestWriterSorts(t *testing.T) {
	rows := []PriceRow{{"C2", 1, 1}, {"C1", 600e6, 2}, {"C1", 0, 3}}
	data, err := Prices.Encode(rows)
	if err != nil {
		t.Fatal(err)
	}
	got, err := Prices.Decode("prices", data)
	if d := cmp.Diff([]PriceRow{{"C1", 0, 3}, {"C1", 600e6, 2}, {"C2", 1, 1}}, got); d != "" || err != nil {
		t.Errorf("%v (-want +got):\n%s", err, d)
	}
	if rows[0].Telescope != "C2" {
		t.Error("the caller's rows were reordered")
	}
}

// otherPrice differs from PriceRow in one thing at a time.
type (
	priceRenamed struct {
		Telescope    string  `parquet:"telescop,dict"`
		SlotStart    int64   `parquet:"slot_start_utc,timestamp(microsecond:utc),delta"`
		PricePerHour float64 `parquet:"price_per_hour"`
	}
	priceMillis struct {
		Telescope    string  `parquet:"telescope,dict"`
		SlotStart    int64   `parquet:"slot_start_utc,timestamp(millisecond:utc),delta"`
		PricePerHour float64 `parquet:"price_per_hour"`
	}
	priceOptional struct {
		Telescope    string  `parquet:"telescope,dict"`
		SlotStart    int64   `parquet:"slot_start_utc,timestamp(microsecond:utc),delta"`
		PricePerHour float64 `parquet:"price_per_hour,optional"`
	}
	priceFloat struct {
		Telescope    string  `parquet:"telescope,dict"`
		SlotStart    int64   `parquet:"slot_start_utc,timestamp(microsecond:utc),delta"`
		PricePerHour float32 `parquet:"price_per_hour"`
	}
	priceShort struct {
		Telescope string `parquet:"telescope,dict"`
		SlotStart int64  `parquet:"slot_start_utc,timestamp(microsecond:utc),delta"`
	}
	priceLong struct {
		PriceRow
		Extra bool `parquet:"extra"`
	}
)

func foreign[T any](t *testing.T, rows []T, options ...parquet.WriterOption) []byte {
	t.Helper()
	var b bytes.Buffer
	if err := parquet.Write(&b, rows, options...); err != nil {
		t.Fatal(err)
	}
	return b.Bytes()
}

func TestReaderRefusesOtherSchemas(t *testing.T) {
	version := parquet.KeyValueMetadata(versionKey, SchemaVersion)
	whole := foreign(t, []PriceRow{{"C1", 0, 1}}, version)
	if _, err := Prices.Decode("prices", whole); err != nil {
		t.Fatalf("the right schema by another writer: %v", err)
	}
	tests := []struct {
		name string
		data []byte
		want string
	}{
		{"renamed", foreign(t, []priceRenamed{{}}, version), `column 1 is telescop required STRING; want telescope`},
		{"unit", foreign(t, []priceMillis{{}}, version), `unit=MILLIS); want slot_start_utc`},
		{"null", foreign(t, []priceOptional{{}}, version), `price_per_hour optional DOUBLE; want price_per_hour required DOUBLE`},
		{"width", foreign(t, []priceFloat{{}}, version), `required FLOAT; want price_per_hour required DOUBLE`},
		{"missing", foreign(t, []priceShort{{}}, version), `column 3 is missing; want price_per_hour`},
		{"more", foreign(t, []priceLong{{}}, version), `column 4 is extra required BOOLEAN; want 3 columns only`},
		{"no version", foreign(t, []PriceRow{{}}), `it has no schema_version`},
		{"version", foreign(t, []PriceRow{{}}, parquet.KeyValueMetadata(versionKey, "99")), `its schema_version is "99"; want "1"`},
		{"empty", nil, `want a whole Parquet file`},
		{"text", []byte("telescope,slot_start_utc\n"), `want a whole Parquet file`},
		{"cut", whole[:len(whole)-5], `want a whole Parquet file`},
	}
	for _, tt := range tests {
		if _, err := Prices.Decode("my/prices.parquet", tt.data); err == nil || !strings.Contains(err.Error(), tt.want) || !strings.HasPrefix(err.Error(), "my/prices.parquet: ") {
			t.Errorf("%s: %v; want the file's name and %q", tt.name, err, tt.want)
		}
	}
}

// TestDamagedBytesNeverPanic flips each byte of tables that have every type of
// column between them; what is read then may be wrong, for the checksum is
// ReadFolder's affair.
func TestDamagedBytesNeverPanic(t *testing.T) {
	for _, k := range []kind{kindOf(Fields), kindOf(Prices), kindOf(Grid)} {
		data := k.sample(5)
		refused := 0
		for at := range data {
			bad := slices.Clone(data)
			bad[at] ^= []byte{0x01, 0x80, 0xff}[at%3]
			if _, err := k.decode("it", bad); err != nil {
				refused++
			}
		}
		if refused < len(data)/3 {
			t.Errorf("%s: only %d of %d flips were refused", k.name, refused, len(data))
		}
	}
}

func TestFiles(t *testing.T) {
	name := filepath.Join(t.TempDir(), "prices.parquet")
	rows := []PriceRow{{"C1", 0, math.Pi}}
	if err := Prices.WriteFile(name, rows); err != nil {
		t.Fatal(err)
	}
	got, err := Prices.ReadFile(name)
	if d := cmp.Diff(rows, got); d != "" || err != nil {
		t.Errorf("%v %s", err, d)
	}
	if _, err := Prices.ReadFile(name + ".not"); err == nil {
		t.Error("a missing file was read")
	}
}
