package tables

import (
	"encoding/json"
	"os"
	"os/exec"
	"path/filepath"
	"reflect"
	"slices"
	"strconv"
	"strings"
	"testing"
)

// seen is what DuckDB saw of one file.
type seen struct {
	Columns  [][]string
	Metadata [][]string
	Codecs   []string
	Rows     [][]string
}

// duckdb has DuckDB read files. It skips where node or the npm package
// @duckdb/node-api is not installed: in the folder that NIGHTWRIGHT_NODE
// names, or in .ci/node.
func duckdb(t *testing.T, files ...string) []seen {
	t.Helper()
	absent := func(why string) {
		if os.Getenv("NIGHTWRIGHT_REQUIRE_ALL") == "1" {
			t.Fatalf("%s, and NIGHTWRIGHT_REQUIRE_ALL is 1", why)
		}
		t.Skip(why)
	}
	node, err := exec.LookPath("node")
	if err != nil {
		absent("node is not installed")
	}
	folder := os.Getenv("NIGHTWRIGHT_NODE")
	if folder == "" {
		folder = filepath.Join("..", "..", ".ci", "node")
	}
	if _, err := os.Stat(filepath.Join(folder, "node_modules", "@duckdb", "node-api")); err != nil {
		absent("@duckdb/node-api is not installed: run npm ci in .ci/node")
	}
	cmd := exec.CommandContext(t.Context(), node, append([]string{filepath.Join("testdata", "duckdb.mjs"), folder}, files...)...)
	cmd.Stderr = os.Stderr
	text, err := cmd.Output()
	if err != nil {
		t.Fatal(err)
	}
	var out []seen
	if err := json.Unmarshal(text, &out); err != nil {
		t.Fatal(err)
	}
	return out
}

// duckTypes are DuckDB's names of our column types.
var duckTypes = map[string]string{
	"INT(64,true)": "BIGINT", "STRING": "VARCHAR", "DATE": "DATE", "DOUBLE": "DOUBLE", "BOOLEAN": "BOOLEAN",
	"TIMESTAMP(isAdjustedToUTC=true,unit=MICROS)": "TIMESTAMP WITH TIME ZONE",
}

// plainCells writes a row as DuckDB's cells: instants in microseconds.
func plainCells(row reflect.Value) []string {
	var out []string
	for i := range row.NumField() {
		v := row.Field(i)
		optional := strings.Contains(row.Type().Field(i).Tag.Get("parquet"), ",optional")
		switch {
		case optional && v.IsZero():
			out = append(out, "")
		case v.Kind() == reflect.Pointer:
			out = append(out, Float(v.Elem().Float()))
		case v.Kind() == reflect.Int32:
			out = append(out, Date(int32(v.Int())))
		case v.Kind() == reflect.Int64:
			out = append(out, strconv.FormatInt(v.Int(), 10))
		case v.Kind() == reflect.Float64:
			out = append(out, Float(v.Float()))
		case v.Kind() == reflect.Bool:
			out = append(out, strconv.FormatBool(v.Bool()))
		default:
			out = append(out, v.String())
		}
	}
	return out
}

// duckCase is one table written for DuckDB, with the cells it should see.
type duckCase struct {
	kind
	data  []byte
	cells [][]string
}

func duckCaseOf[T any](t *testing.T, table Table[T]) duckCase {
	t.Helper()
	rows := sampleRows[T](30)
	// A row of zeros has every null there can be.
	rows = append(rows, *new(T))
	data, err := table.Encode(rows)
	if err != nil {
		t.Fatal(err)
	}
	table.Sort(rows)
	c := duckCase{kind: kindOf(table), data: data}
	for i := range rows {
		c.cells = append(c.cells, plainCells(reflect.ValueOf(rows[i])))
	}
	return c
}

// TestDuckDBReadsEveryTable is the outside reader: DuckDB (npm package
// @duckdb/node-api) sees the same columns, types and values.
func TestDuckDBReadsEveryTable(t *testing.T) {
	cases := []duckCase{
		duckCaseOf(t, Visits), duckCaseOf(t, Fields), duckCaseOf(t, Demands), duckCaseOf(t, Nights),
		duckCaseOf(t, Prices), duckCaseOf(t, Changes), duckCaseOf(t, Grid), duckCaseOf(t, Almanac),
		duckCaseOf(t, Parts), duckCaseOf(t, Seasons), duckCaseOf(t, Bands), duckCaseOf(t, Chances),
		duckCaseOf(t, Networks), duckCaseOf(t, Pairs), duckCaseOf(t, Worths), duckCaseOf(t, Strengths),
	}
	dir := t.TempDir()
	var files []string
	for _, c := range cases {
		name := filepath.Join(dir, c.name+suffix)
		if err := os.WriteFile(name, c.data, 0o644); err != nil {
			t.Fatal(err)
		}
		files = append(files, name)
	}
	for i, got := range duckdb(t, files...) {
		c := cases[i]
		var names []string
		for k, f := range c.schema.Fields() {
			names = append(names, f.Name())
			want := duckTypes[f.Type().String()]
			if want == "" || k >= len(got.Columns) || got.Columns[k][0] != f.Name() || got.Columns[k][1] != want {
				t.Errorf("%s: column %d is %v; want %s %s", c.name, k+1, got.Columns[k], f.Name(), want)
			}
		}
		if !slices.Equal(names, c.columns) || len(got.Columns) != len(names) {
			t.Errorf("%s: %d columns; want %q", c.name, len(got.Columns), names)
		}
		if !slices.ContainsFunc(got.Metadata, func(m []string) bool { return m[0] == versionKey && m[1] == SchemaVersion }) {
			t.Errorf("%s: metadata %v; want %s %s", c.name, got.Metadata, versionKey, SchemaVersion)
		}
		if !slices.Equal(got.Codecs, []string{"ZSTD"}) {
			t.Errorf("%s: compressed by %v; want ZSTD", c.name, got.Codecs)
		}
		if !slices.EqualFunc(got.Rows, c.cells, slices.Equal) {
			t.Errorf("%s: rows\n%q\nwant\n%q", c.name, got.Rows, c.cells)
		}
	}
}
