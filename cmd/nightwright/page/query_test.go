package page

import (
	"encoding/xml"
	"fmt"
	"math"
	"os"
	"os/exec"
	"path/filepath"
	"strconv"
	"strings"
	"testing"

	"nightwright/constraints"
	"nightwright/visibility"
)

// votableDoc is as much of a VOTable as the tests look at.
type votableDoc struct {
	Resource struct {
		Infos []struct {
			Name  string `xml:"name,attr"`
			Value string `xml:"value,attr"`
		} `xml:"INFO"`
		Table struct {
			Fields []struct {
				Name string `xml:"name,attr"`
			} `xml:"FIELD"`
			Rows []struct {
				Cells []string `xml:"TD"`
			} `xml:"DATA>TABLEDATA>TR"`
		} `xml:"TABLE"`
	} `xml:"RESOURCE"`
}

func (d *desk) votable(path string, want int) *votableDoc {
	d.t.Helper()
	code, head, text := d.ask("GET", path, "")
	if code != want || head.Get("Content-Type") != votableKind {
		d.t.Fatalf("%s: %d %s: %.300s", path, code, head.Get("Content-Type"), text)
	}
	var doc votableDoc
	if err := xml.Unmarshal([]byte(text), &doc); err != nil {
		d.t.Fatalf("%s: %v", path, err)
	}
	return &doc
}

func (v *votableDoc) status() string {
	out := ""
	for _, i := range v.Resource.Infos {
		if i.Name == "QUERY_STATUS" {
			out += i.Value + ";"
		}
	}
	return out
}

func (v *votableDoc) column(t *testing.T, name string) []float64 {
	t.Helper()
	for k, f := range v.Resource.Table.Fields {
		if f.Name != name {
			continue
		}
		var out []float64
		for _, r := range v.Resource.Table.Rows {
			x, err := strconv.ParseFloat(r.Cells[k], 64)
			if err != nil {
				t.Fatal(err)
			}
			out = append(out, x)
		}
		return out
	}
	t.Fatalf("there is no column %s", name)
	return nil
}

// TestVisibleAgreesWithTheExactPath: inside a window the rules hold on the
// exact path, just outside one of them doesn't, or the open time ends.
func TestVisibleAgreesWithTheExactPath(t *testing.T) {
	d := newDesk(t)
	v, err := d.s.books.view(t.Context())
	if err != nil {
		t.Fatal(err)
	}
	// 2027-03-08 is MJD 61472 (astropy.time.Time('2027-03-08').mjd).
	doc := d.votable("/vis?POS=120.0,20.0&TIME=61472/61477&FACILITY=C1", 200)
	if doc.status() != "OK;" {
		t.Fatalf("status %s", doc.status())
	}
	from, to := doc.column(t, "t_start"), doc.column(t, "t_stop")
	if len(from) < 3 {
		t.Fatalf("%d windows in 4 nights", len(from))
	}
	f := 0
	for i := range v.Survey.Fields {
		if v.Survey.Fields[i].Program == 0 {
			f = i
			break
		}
	}
	p := visibility.Position{RA: 120 * degree, Dec: 20 * degree}
	place := constraints.Place(&v.Sites[v.Telescopes[0].Site])
	legal := func(at float64) bool {
		s := constraints.ExactSight(v.Exact, place, p, v.Filters[1], at)
		return constraints.Evaluate(v.Survey.Survey, f, 0, 0, &s)&^(constraints.Quality) == 0 && v.Calendar.Reasons(0, at) == 0
	}
	for k := range from {
		a, b := (from[k]-mjdEpoch)*86400, (to[k]-mjdEpoch)*86400
		for _, at := range []float64{a + 1, (a + b) / 2, b - 1} {
			if !legal(at) {
				t.Errorf("window %d: not legal at %.0f s of %.0f", k, at-a, b-a)
			}
		}
		if legal(a-5) || legal(b+5) {
			t.Errorf("window %d is longer than it says", k)
		}
		if seconds := doc.column(t, "t_visibility")[k]; math.Abs(seconds-(b-a)) > 0.01 {
			t.Errorf("window %d: t_visibility %.3f; want %.3f", k, seconds, b-a)
		}
		if lo, hi := doc.column(t, "elevation_min")[k], doc.column(t, "elevation_max")[k]; lo < 29.99 || hi > 90 || hi < lo {
			t.Errorf("window %d: elevation %.2f to %.2f; the rule is 30", k, lo, hi)
		}
	}
}

// TestQueriesFollowTheStandard: DALI 1.1's words for what is wrong, and for a
// table that was cut short.
func TestQueriesFollowTheStandard(t *testing.T) {
	d := newDesk(t)
	for _, path := range []string{
		"/vis", "/vis?POS=120&TIME=61472/61473", "/vis?POS=400,0&TIME=61472/61473", "/vis?POS=120,95&TIME=61472/61473", "/vis?POS=120,20", "/vis?POS=120,20&TIME=61473",
		"/vis?POS=120,20&TIME=61473/61472", "/vis?POS=NaN,20&TIME=61472/61473", "/vis?POS=120,20&TIME=61472/Inf", "/vis?POS=120,20&TIME=61472/61473&MAXREC=-1", "/vis?POS=120,20&TIME=61472/61473&VIS_MIN=x",
		"/vis?POS=120,20&TIME=61472/61473&RESPONSEFORMAT=fits", "/vis?POS=120,20&TIME=61472/61473&pos=1,2", "/vis?POS=120,20&TIME=61472/61473&NAME=x", "/vis?POS=120,20&TIME=61472/61473&PROGRAM=none",
		"/obsplan?TIME=x", "/obsplan?MAXREC=x", "/obsplan?WHERE=1",
	} {
		if doc := d.votable(path, 400); doc.status() != "ERROR;" {
			t.Errorf("%s: status %s", path, doc.status())
		}
	}
	if doc := d.votable("/vis?pos=120,20&time=61472/61477&maxrec=1", 200); doc.status() != "OK;OVERFLOW;" || len(doc.Resource.Table.Rows) != 1 {
		t.Errorf("cut short: %s with %d rows", doc.status(), len(doc.Resource.Table.Rows))
	}
	if doc := d.votable("/vis?POS=120,20&TIME=61472/61477&MAXREC=0", 200); doc.status() != "OK;" || len(doc.Resource.Table.Rows) != 0 || len(doc.Resource.Table.Fields) != 9 {
		t.Errorf("no rows asked for: %s with %d rows", doc.status(), len(doc.Resource.Table.Rows))
	}
	if doc := d.votable("/vis?POS=120,20&TIME=50000/50001", 200); doc.status() != "OK;" || len(doc.Resource.Table.Rows) != 0 {
		t.Errorf("outside the period: %s with %d rows", doc.status(), len(doc.Resource.Table.Rows))
	}
	if doc := d.votable("/vis?POS=120,-89.5&TIME=61472/61477", 200); len(doc.Resource.Table.Rows) != 0 {
		t.Errorf("the south pole of the sky is seen from the north %d times", len(doc.Resource.Table.Rows))
	}
	all := len(d.votable("/obsplan", 200).Resource.Table.Rows)
	c1 := len(d.votable("/obsplan?FACILITY=C1", 200).Resource.Table.Rows)
	s1 := len(d.votable("/obsplan?FACILITY=Salt%20Mesa", 200).Resource.Table.Rows)
	if all != 21 || c1+s1 != all {
		t.Errorf("%d planned observations, %d and %d; want 21 and both together", all, c1, s1)
	}
	sum := 0
	for day := 61471; day < 61478; day++ {
		sum += len(d.votable(fmt.Sprintf("/obsplan?TIME=%d/%d", day, day+1), 200).Resource.Table.Rows)
	}
	if sum < all || sum > all+7 { // one that runs over midnight stands in both days
		t.Errorf("day by day %d; want %d", sum, all)
	}
	if doc := d.votable("/obsplan?MAXREC=3", 200); doc.status() != "OK;OVERFLOW;" || len(doc.Resource.Table.Rows) != 3 {
		t.Errorf("cut short: %s with %d rows", doc.status(), len(doc.Resource.Table.Rows))
	}
}

// TestVotlint: stilts votlint has nothing to say of any answer.
func TestVotlint(t *testing.T) {
	if _, err := exec.LookPath("stilts"); err != nil {
		if os.Getenv("NIGHTWRIGHT_REQUIRE_ALL") == "1" {
			t.Fatal("stilts is missing")
		}
		t.Skip("stilts is missing")
	}
	d := newDesk(t)
	for k, path := range []string{"/vis?POS=120,20&TIME=61472/61477", "/obsplan", "/vis?POS=120,20&TIME=61472/61477&MAXREC=1", "/vis"} {
		_, _, text := d.ask("GET", path, "")
		file := filepath.Join(t.TempDir(), fmt.Sprintf("%d.vot", k))
		if err := os.WriteFile(file, []byte(text), 0o644); err != nil {
			t.Fatal(err)
		}
		out, err := exec.Command("stilts", "votlint", "votable="+file, "version=1.4", "ucd=true", "unit=true").CombinedOutput()
		if s := strings.TrimSpace(string(out)); s != "" || err != nil {
			t.Errorf("%s: %v: %s", path, err, s)
		}
	}
}
