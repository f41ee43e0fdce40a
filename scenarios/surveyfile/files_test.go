package surveyfile

import (
	"fmt"
	"os"
	"path/filepath"
	"strings"
	"testing"

	"github.com/google/go-cmp/cmp"

	"nightwright/visibility/ephemeris"
)

// parquetSurvey is the good survey with a Parquet field list.
func parquetSurvey(t testing.TB) string {
	return strings.Replace(good(t, "survey.yaml"), "fields.csv", "fields.parquet", 1)
}

func parquetFields(t testing.TB, name string) []byte {
	t.Helper()
	list, err := os.ReadFile(filepath.Join("testdata", "parquet", name))
	if err != nil {
		t.Fatal(err)
	}
	return list
}

// The list of testdata/parquet says the same as the CSV one, but for a few
// columns that it has not.
func TestParquetFields(t *testing.T) {
	sv, source := mustLoad(t, folderOf(t, "survey.yaml", parquetSurvey(t), "fields.parquet", string(parquetFields(t, "fields.parquet"))))
	want := goodSurvey().Fields
	want[1].PMRA, want[1].PMDec, want[1].Tile = 0, 0, 1*degree
	want[2].Tile = 1 * degree
	for i := range want[1].Rules { // no airmass_max of the field's own
		want[1].Rules[i].AirmassMax = 2
	}
	want[2].Rules = want[0].Rules
	if d := cmp.Diff(want, sv.Fields, closely...); d != "" {
		t.Errorf("want -, got +:\n%s", d)
	}
	if f := source.Files[1]; f.Name != "fields.parquet" || f.Bytes != int64(len(parquetFields(t, "fields.parquet"))) {
		t.Errorf("source %+v", f)
	}
}

// Decimals of any width are read as the number that is written.
func TestParquetDecimals(t *testing.T) {
	list := parquetFields(t, "decimals.parquet")
	text := strings.Replace(parquetSurvey(t), "telescopes: [C1]\n", "telescopes: [C1, S1]\n", 1)
	sv, _ := mustLoad(t, folderOf(t, "survey.yaml", text, "fields.parquet", string(list)))
	a, b := &sv.Fields[0], &sv.Fields[1]
	got := []float64{a.RA / degree, a.Dec / degree, a.Weight, b.RA / degree, b.Dec / degree, b.Weight}
	want := []float64{150.5, -20.25, 1, 359.999999999, -0.0001, 2.5}
	if d := cmp.Diff(want, got, closely...); d != "" {
		t.Errorf("want -, got +:\n%s", d)
	}
}

// A damaged list is a fault, whatever byte is wrong, or is still readable;
// it never ends the program.
func TestDamagedParquetIsAFault(t *testing.T) {
	list := parquetFields(t, "fields.parquet")
	text := parquetSurvey(t)
	dir := folderOf(t, "survey.yaml", text)
	path := filepath.Join(dir, "fields.parquet")
	refused := 0
	for i := range list {
		damaged := append([]byte(nil), list...)
		damaged[i] ^= 0x40
		if err := os.WriteFile(path, damaged, 0o644); err != nil {
			t.Fatal(err)
		}
		sv, _, issues := Load(dir)
		if (sv == nil) != (Faults(issues) > 0) {
			t.Fatalf("byte %d: survey %v with %d faults", i, sv != nil, Faults(issues))
		}
		if sv == nil {
			refused++
		}
	}
	if refused < len(list)/2 {
		t.Errorf("%d of %d damaged lists were refused; want most", refused, len(list))
	}
	for _, short := range []int{0, 4, len(list) / 2, len(list) - 1} {
		if err := os.WriteFile(path, list[:short], 0o644); err != nil {
			t.Fatal(err)
		}
		if sv, _, issues := Load(dir); sv != nil || len(issues) != 1 || issues[0].File != path {
			t.Errorf("cut to %d bytes: %v", short, issues)
		}
	}
}

// A row of a finals2000A file, in the columns that IERS publishes for it
// (readme.finals2000A): date 1-6, MJD 8-15, UT1-UTC 59-68 in s.
func finalsRow(date string, mjd, dut1 float64) string {
	return fmt.Sprintf("%-7s%8.2f%-42sI%10.7f\n", date, mjd, "", dut1)
}

func TestEarthOrientationFiles(t *testing.T) {
	iers := finalsRow("27 130", 61435, 0.05) + finalsRow("27 131", 61436, 0.051)
	text := strings.Replace(good(t, "survey.yaml"), "dut1_s: 0.1", "iers: finals.data, leap_seconds: leap.list", 1)
	const leap = "#@ 4700000000\n2272060800 10\n2287785600 11\n"
	dir := folderOf(t, "survey.yaml", text, "fields.csv", good(t, "fields.csv"), "finals.data", iers, "leap.list", leap)
	sv, source, issues := Load(dir)
	want := []string{"survey.yaml:7: warning: UT1-UTC is in the file from 2027-01-30 to 2027-01-31, not for all nights from 2027-02-01 to 2027-03-31; outside it the nearest value is held, which may be off by some tenths of a second"}
	if d := cmp.Diff(want, told(dir, issues)); d != "" {
		t.Error(d)
	}
	if sv == nil {
		t.Fatal("no survey")
	}
	rows := []ephemeris.DUT1Row{{MJD: 61435, DUT1: 0.05}, {MJD: 61436, DUT1: 0.051}}
	if d := cmp.Diff(rows, sv.Orientation.Table); d != "" {
		t.Error(d)
	}
	// 1972-07-01 brought TAI-UTC to 11 s (IERS Bulletin C).
	if sv.LeapSeconds == nil || sv.LeapSeconds.At(1e9) != 11 {
		t.Error("the leap seconds are not those of the list")
	}
	var names []string
	for _, f := range source.Files {
		names = append(names, f.Name)
	}
	if d := cmp.Diff([]string{"survey.yaml", "finals.data", "leap.list", "fields.csv"}, names); d != "" {
		t.Error(d)
	}
}

// A link may not lead out of the folder either.
func TestLinksStayInTheFolder(t *testing.T) {
	outside := folderOf(t, "fields.csv", good(t, "fields.csv"))
	dir := folderOf(t, "survey.yaml", good(t, "survey.yaml"))
	if err := os.Symlink(filepath.Join(outside, "fields.csv"), filepath.Join(dir, "fields.csv")); err != nil {
		if os.Getenv("NIGHTWRIGHT_REQUIRE_ALL") == "1" {
			t.Fatal(err)
		}
		t.Skip("no symbolic links here: ", err)
	}
	sv, _, issues := Load(dir)
	if sv != nil || len(issues) != 1 || !strings.Contains(issues[0].What, `the field list "fields.csv" can't be read`) {
		t.Errorf("got %v", issues)
	}
}

func TestAFolderIsNoFieldList(t *testing.T) {
	dir := folderOf(t, "survey.yaml", good(t, "survey.yaml"))
	if err := os.Mkdir(filepath.Join(dir, "fields.csv"), 0o755); err != nil {
		t.Fatal(err)
	}
	_, _, issues := Load(dir)
	want := []string{`survey.yaml:6: the field list "fields.csv" can't be read: it is no file; want a .csv or .parquet file in the survey's folder`}
	if d := cmp.Diff(want, told(dir, issues)); d != "" {
		t.Error(d)
	}
}

func TestFilesOverTheirLimitAreRefused(t *testing.T) {
	dir := folderOf(t, "survey.yaml", good(t, "survey.yaml"), "fields.csv", good(t, "fields.csv"))
	grow := func(name string, size int64) {
		if err := os.Truncate(filepath.Join(dir, name), size); err != nil {
			t.Fatal(err)
		}
	}
	grow("fields.csv", MaxFieldBytes+1) // a hole, no bytes on disk
	_, _, issues := Load(dir)
	want := []string{`survey.yaml:6: the field list "fields.csv" can't be read: it has 536870913 bytes, more than the limit of 536870912; want a .csv or .parquet file in the survey's folder`}
	if d := cmp.Diff(want, told(dir, issues)); d != "" {
		t.Error(d)
	}
	grow("survey.yaml", MaxSurveyBytes+1)
	_, _, issues = Load(dir)
	want = []string{`survey.yaml:1: it can't be read: it has 4194305 bytes, more than the limit of 4194304; want a survey folder with survey.yaml, or that file`}
	if d := cmp.Diff(want, told(dir, issues)); d != "" {
		t.Error(d)
	}
}

// manyFields is a field list of n rows.
func manyFields(n int) string {
	var b strings.Builder
	b.WriteString("field,ra_deg,dec_deg,program\n")
	for i := range n {
		fmt.Fprintf(&b, "F%d,%.4f,%.4f,%s\n", i, float64(i%36000)/100, float64(i%5000)/100-10+float64(i/180000)/1000, [2]string{"wide", "movers"}[i%2])
	}
	return b.String()
}

func TestAMillionFieldsWork(t *testing.T) {
	if testing.Short() && os.Getenv("NIGHTWRIGHT_REQUIRE_ALL") != "1" {
		t.Skip("a million rows")
	}
	dir := folderOf(t, "survey.yaml", good(t, "survey.yaml"), "fields.csv", manyFields(MaxFields))
	sv, _ := mustLoad(t, dir)
	if len(sv.Fields) != MaxFields || sv.Fields[MaxFields-1].Name != "F999999" {
		t.Errorf("%d fields", len(sv.Fields))
	}
	dir = folderOf(t, "survey.yaml", good(t, "survey.yaml"), "fields.csv", manyFields(MaxFields)+"one more,0,0,wide\n")
	sv, _, issues := Load(dir)
	want := []string{"fields.csv:1000002: the field list has more rows than the limit; want at most 1000000 fields"}
	if d := cmp.Diff(want, told(dir, issues)); d != "" || sv != nil {
		t.Error(d)
	}
}

// Faults in every row are told up to a number, and then counted.
func TestFaultsInEveryRowAreCounted(t *testing.T) {
	list := strings.ReplaceAll(manyFields(2500), ",wide", ",widee")
	dir := folderOf(t, "survey.yaml", good(t, "survey.yaml"), "fields.csv", list)
	_, _, issues := Load(dir)
	got := told(dir, issues)
	if len(got) != maxRowFaults+1 {
		t.Fatalf("%d issues; want %d", len(got), maxRowFaults+1)
	}
	if want := `fields.csv:2: the program "widee" is not defined; did you mean "wide"?`; got[0] != want {
		t.Errorf("first %s; want %s", got[0], want)
	}
	if want := "fields.csv:2501: the field list has 250 more faults; mend those above first"; got[maxRowFaults] != want {
		t.Errorf("last %s; want %s", got[maxRowFaults], want)
	}
}

func BenchmarkLoadMillionFields(b *testing.B) {
	dir := folderOf(b, "survey.yaml", good(b, "survey.yaml"), "fields.csv", manyFields(MaxFields))
	b.ReportAllocs()
	for b.Loop() {
		if sv, _, _ := Load(dir); sv == nil {
			b.Fatal("no survey")
		}
	}
}
