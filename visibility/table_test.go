package visibility

import (
	"encoding/csv"
	"math"
	"os"
	"path/filepath"
	"strconv"
	"testing"
	"time"

	"nightwright/visibility/ephemeris"
)

// row is one line of a reference table by column name.
type row map[string]string

// table reads a reference table of testdata; its README names the sources.
func table(t testing.TB, name string) []row {
	t.Helper()
	f, err := os.Open(filepath.Join("testdata", name))
	if err != nil {
		t.Fatal(err)
	}
	defer f.Close()
	lines, err := csv.NewReader(f).ReadAll()
	if err != nil {
		t.Fatal(err)
	}
	rows := make([]row, 0, len(lines)-1)
	for _, line := range lines[1:] {
		r := row{}
		for i, col := range lines[0] {
			r[col] = line[i]
		}
		rows = append(rows, r)
	}
	if len(rows) == 0 {
		t.Fatalf("%s is empty", name)
	}
	return rows
}

// num reads a number.
func (r row) num(t testing.TB, col string) float64 {
	t.Helper()
	x, err := strconv.ParseFloat(r[col], 64)
	if err != nil {
		t.Fatalf("column %s: %v", col, err)
	}
	return x
}

// rad reads an angle in degrees.
func (r row) rad(t testing.TB, col string) float64 { return r.num(t, col) * degree }

// site reads lat_deg, lon_east_deg, elev_m.
func (r row) site(t testing.TB) Site {
	return Site{r.rad(t, "lat_deg"), r.rad(t, "lon_east_deg"), r.num(t, "elev_m")}
}

// unix reads the instant from mjd_int and mjd_frac.
func (r row) unix(t testing.TB) float64 {
	return (r.num(t, "mjd_int")-40587)*86400 + r.num(t, "mjd_frac")*86400
}

// instant reads an ISO instant.
func instant(t testing.TB, s string) float64 {
	t.Helper()
	x, err := time.Parse(time.RFC3339Nano, s)
	if err != nil {
		t.Fatal(err)
	}
	return float64(x.UnixMilli()) / 1000
}

// exactWith returns the exact path with a constant UT1-UTC.
func exactWith(dut1 float64) *Exact {
	return NewExact(ephemeris.NewClock(nil, ephemeris.Orientation{DUT1: dut1}))
}

// seen is a horizon direction from altitude and azimuth.
func seen(alt, az float64) ephemeris.Vec {
	s, c := math.Sincos(alt)
	sa, ca := math.Sincos(az)
	return ephemeris.Vec{c * sa, c * ca, s}
}

// arcsec turns rad into arc seconds.
func arcsec(rad float64) float64 { return rad / degree * 3600 }

// turnDiff is a-b in (-pi, pi].
func turnDiff(a, b float64) float64 { return math.Remainder(a-b, 2*math.Pi) }

// worst keeps the greatest of a kind of error.
type worst struct {
	v  float64
	at string
}

func (w *worst) see(v float64, at string) {
	if v = math.Abs(v); v > w.v || math.IsNaN(v) {
		w.v, w.at = v, at
	}
}

// check fails above a limit and tells the greatest in any case.
func (w *worst) check(t *testing.T, what string, limit float64) {
	t.Helper()
	if !(w.v <= limit) {
		t.Errorf("%s: worst %.6g at %s, limit %g", what, w.v, w.at, limit)
	} else {
		t.Logf("%s: worst %.6g (limit %g)", what, w.v, limit)
	}
}
