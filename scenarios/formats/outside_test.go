package formats

import (
	"bytes"
	"encoding/json"
	"fmt"
	"maps"
	"os"
	"os/exec"
	"slices"
	"strings"
	"testing"

	"nightwright/scheduler/tables"
)

// TestVOTableLint: stilts votlint (Debian's stilts 3.4.7) has nothing to say
// of any VOTable, and has of one with a fault.
func TestVOTableLint(t *testing.T) {
	if _, err := exec.LookPath("stilts"); err != nil {
		if os.Getenv("NIGHTWRIGHT_REQUIRE_ALL") == "1" {
			t.Fatal("stilts is missing")
		}
		t.Skip("stilts is missing; on Debian: apt-get install stilts")
	}
	lint := func(doc Document, old, fresh string) string {
		path := writeFile(t, "x.vot", func(b *bytes.Buffer) error {
			var text bytes.Buffer
			err := WriteVOTable(&text, doc)
			b.WriteString(replaced(text.String(), old, fresh))
			return err
		})
		out, _ := exec.Command("stilts", "votlint", "votable="+path, "version=1.4", "ucd=true", "unit=true").CombinedOutput()
		return strings.TrimSpace(string(out))
	}
	docs := documents(fixture(t))
	for _, name := range slices.Sorted(maps.Keys(docs)) {
		if out := lint(docs[name], "", ""); out != "" {
			t.Errorf("%s: %s", name, out)
		}
	}
	// Debian's build looks at the schema and the cells, and not at UCDs and
	// units; those are for astropy below.
	for _, bad := range [][2]string{{`ref="utc"`, `ref="nowhere"`}, {`datatype="double"`, `datatype="single"`}, {"<TR>", "<TR><TD/>"}} {
		if out := lint(docs["prices"], bad[0], bad[1]); out == "" {
			t.Errorf("%s instead of %s passes", bad[1], bad[0])
		}
	}
}

// astropyDump prints a table as JSON: a list of rows, null where masked.
const astropyDump = `
import sys, json, warnings
import numpy as np
warnings.simplefilter('error')
# This astropy's list of UCDs is older than the word pos.outline (UCD1+ 1.4).
warnings.filterwarnings('ignore', message='.*Unknown word .pos.outline')
from astropy.table import Table
from astropy.io import votable
out = {}
for path in sys.argv[1:]:
    if path.endswith('.vot'):
        t = votable.parse(path, verify='warn').get_first_table()
        meta = {f.name: [str(f.unit or ''), f.ucd or '', f.ref or ''] for f in t.fields}
        t = t.to_table()
    else:
        t = Table.read(path, format='ascii.ecsv')
        meta = {c: [str(t[c].unit or ''), t[c].meta.get('ucd', ''), t[c].description or ''] for c in t.colnames}
    rows = []
    for r in t:
        row = []
        for c in t.colnames:
            v = r[c]
            if v is np.ma.masked or np.ma.is_masked(v): v = None
            elif isinstance(v, np.ndarray): v = v.tolist()
            elif isinstance(v, np.generic): v = v.item()
            if isinstance(v, float) and v != v: v = None
            row.append(v)
        rows.append(row)
    out[path.split('/')[-1]] = {'columns': t.colnames, 'rows': rows, 'meta': meta}
json.dump(out, sys.stdout)
`

type dumped struct {
	Columns []string
	Rows    [][]any
	Meta    map[string][]string
}

// same compares what astropy read with what was written.
func same(t *testing.T, name string, got dumped, want Table, instant func(int64) any) {
	t.Helper()
	var columns []string
	for _, c := range want.Columns {
		columns = append(columns, c.Name)
	}
	if !slices.Equal(got.Columns, columns) || len(got.Rows) != len(want.Rows) {
		t.Fatalf("%s: astropy reads %d rows of %v, want %d of %v", name, len(got.Rows), got.Columns, len(want.Rows), columns)
	}
	for r, row := range want.Rows {
		for i, cell := range row {
			switch x := cell.(type) {
			case int64:
				cell = float64(x) // as JSON gives it
				if want.Columns[i].Kind == Instant {
					cell = instant(x)
				}
			case int32:
				cell = tables.Date(x)
			case []float64:
				cell = []any{x[0], x[1], x[2]}
			case nil:
				if want.Columns[i].Kind == Text && got.Rows[r][i] == "" {
					continue // no text and empty text are one in a VOTable
				}
			}
			if fmt.Sprintf("%#v", got.Rows[r][i]) != fmt.Sprintf("%#v", cell) {
				t.Errorf("%s row %d, %s: astropy reads %#v, want %#v", name, r, columns[i], got.Rows[r][i], cell)
			}
		}
	}
}

// TestAstropyReadsBack: astropy (Debian's python3-astropy 5.2.1) reads the
// same values, units and UCDs, without a warning.
func TestAstropyReadsBack(t *testing.T) {
	p := fixture(t)
	docs := documents(p)
	var paths []string
	for _, name := range slices.Sorted(maps.Keys(docs)) {
		paths = append(paths, writeFile(t, name+".vot", func(b *bytes.Buffer) error { return WriteVOTable(b, docs[name]) }))
		if name != "ivoa.obsplan" {
			paths = append(paths, writeFile(t, name+".ecsv", func(b *bytes.Buffer) error { return WriteECSV(b, docs[name].Table, docs[name].Infos) }))
		}
	}
	var got map[string]dumped
	if err := json.Unmarshal([]byte(python(t, "astropy", astropyDump, paths...)), &got); err != nil {
		t.Fatal(err)
	}
	if len(got) != len(paths) {
		t.Fatalf("%d tables read of %d", len(got), len(paths))
	}
	for name, doc := range docs {
		vot := got[name+".vot"]
		same(t, name+".vot", vot, doc.Table, func(us int64) any { return MJD(us) })
		for i, c := range doc.Table.Columns {
			if m := vot.Meta[c.Name]; m[1] != c.UCD || m[2] != doc.Table.Columns[i].frame() {
				t.Errorf("%s.vot, %s: unit, UCD and ref are %q", name, c.Name, m)
			}
		}
		if name != "ivoa.obsplan" {
			same(t, name+".ecsv", got[name+".ecsv"], doc.Table, func(us int64) any { return tables.Instant(us) })
		}
	}
	if m := got["visits.vot"].Meta; m["sky_mag_arcsec2"][0] != "mag / arcsec2" || m["start_utc"][0] != "d" || m["ra_deg"][0] != "deg" || m["exposure_s"][0] != "s" {
		t.Errorf("units as astropy understands them: %q", m)
	}
}

// TestCalendarsAreRead by two other libraries: Debian's python3-icalendar
// 4.0.3 and python3-vobject.
func TestCalendarsAreRead(t *testing.T) {
	p := fixture(t)
	path := writeFile(t, "nights.ics", func(b *bytes.Buffer) error { return WriteCalendar(b, p) })
	want := [][]string{
		{"Small-Lantern-C1-2027-03-08@nightwright", "20270309T035000Z", "20270309T041341Z", "20270308T000000Z", "C1: 4 exposures of 3 fields", "Cinder Ridge"},
		{"Small-Lantern-S1-2027-03-08@nightwright", "20270309T035140Z", "20270309T035641Z", "20270308T000000Z", "S1: 1 exposures of 1 fields", "Salt; Mesa, north"},
	}
	for library, script := range map[string]string{
		"icalendar": `
import sys, json, icalendar
c = icalendar.Calendar.from_ical(open(sys.argv[1], 'rb').read())
f = lambda d: d.dt.strftime('%Y%m%dT%H%M%SZ')
out = []
for e in c.walk('VEVENT'):
    assert not e.errors, e.errors
    assert 'telescope ' in str(e['DESCRIPTION']) and '\n' in str(e['DESCRIPTION'])
    out.append([str(e['UID']), f(e['DTSTART']), f(e['DTEND']), f(e['DTSTAMP']), str(e['SUMMARY']), str(e['LOCATION'])])
json.dump(out, sys.stdout)
`, "vobject": `
import sys, json, vobject
c = vobject.readOne(open(sys.argv[1], newline='').read())
c.validate(raiseException=True)
f = lambda d: d.value.strftime('%Y%m%dT%H%M%SZ')
json.dump([[e.uid.value, f(e.dtstart), f(e.dtend), f(e.dtstamp), e.summary.value, e.location.value] for e in c.vevent_list], sys.stdout)
`} {
		t.Run(library, func(t *testing.T) {
			var got [][]string
			if err := json.Unmarshal([]byte(python(t, library, script, path)), &got); err != nil {
				t.Fatal(err)
			}
			if fmt.Sprint(got) != fmt.Sprint(want) {
				t.Errorf("%s reads\n%v\nwant\n%v", library, got, want)
			}
		})
	}
}

// replaced is strings.ReplaceAll, and the text itself for an empty old.
func replaced(text, old, fresh string) string {
	if old == "" {
		return text
	}
	return strings.ReplaceAll(text, old, fresh)
}
