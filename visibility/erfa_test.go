package visibility

import (
	"bytes"
	"fmt"
	"math"
	"math/rand/v2"
	"os"
	"os/exec"
	"testing"

	"nightwright/visibility/ephemeris"
)

// needs skips a test whose outside tool is absent, and fails it where the
// whole set is required.
func needs(t testing.TB, reason string) {
	t.Helper()
	if os.Getenv("NIGHTWRIGHT_REQUIRE_ALL") == "1" {
		t.Fatal(reason)
	}
	t.Skip(reason)
}

// pythonWith returns a Python that has a module, the system's own first.
func pythonWith(t testing.TB, module string) string {
	t.Helper()
	for _, name := range []string{"/usr/bin/python3", "python3"} {
		if path, err := exec.LookPath(name); err == nil && exec.Command(path, "-c", "import "+module).Run() == nil {
			return path
		}
	}
	needs(t, "no python3 with the module "+module+" (Debian: python3-"+module+")")
	return ""
}

// TestAgainstERFA computes fresh places with proper motion, and galactic and
// ecliptic coordinates, by python3-erfa and compares.
func TestAgainstERFA(t *testing.T) {
	python := pythonWith(t, "erfa")
	rnd := rand.New(rand.NewPCG(7, 11))
	const n = 500
	var in bytes.Buffer
	var got [n]ephemeris.Vec
	var positions [n]Position
	for i := range n {
		p := Position{
			RA: rnd.Float64() * 2 * math.Pi, Dec: math.Asin(2*rnd.Float64() - 1),
			PMRA: rnd.NormFloat64() * degree / 3600, PMDec: rnd.NormFloat64() * degree / 3600,
		}
		s := Site{math.Asin(2*rnd.Float64() - 1), (2*rnd.Float64() - 1) * math.Pi, 4000 * rnd.Float64()}
		unix := math.Floor(1.7e9 + 5e8*rnd.Float64()) // 2023 to 2039
		dut1 := 1.6*rnd.Float64() - 0.8
		got[i] = exactWith(dut1).Star(s, p, unix).Direction
		positions[i] = p
		days := math.Floor(unix / 86400)
		fmt.Fprintln(&in, p.RA, p.Dec, p.PMRA, p.PMDec, s.Latitude, s.Longitude, s.Elevation,
			2440587.5+days, (unix-86400*days)/86400, dut1)
	}
	cmd := exec.Command(python, "testdata/erfa_places.py")
	cmd.Stdin = &in
	var errs bytes.Buffer
	cmd.Stderr = &errs
	out, err := cmd.Output()
	if err != nil {
		t.Fatalf("%v: %s", err, errs.String())
	}
	var place, gal, ecl worst
	lines := bytes.Fields(out)
	if len(lines) != 7*n {
		t.Fatalf("%d numbers, want %d", len(lines), 7*n)
	}
	for i := range n {
		var v [7]float64
		for k := range v {
			v[k] = parse(t, string(lines[7*i+k]))
		}
		at := fmt.Sprint(i)
		place.see(arcsec(angle(got[i], ephemeris.Vec{v[0], v[1], v[2]})), at)
		p := positions[i]
		gal.see(arcsec(angle(fromAngles(Galactic.FromICRS(p.RA, p.Dec)), fromAngles(v[3], v[4]))), at)
		ecl.see(arcsec(angle(fromAngles(Ecliptic.FromICRS(p.RA, p.Dec)), fromAngles(v[5], v[6]))), at)
	}
	place.check(t, "place, arcsec", 0.01)
	gal.check(t, "galactic, arcsec", 1e-6)
	ecl.check(t, "ecliptic, arcsec", 1e-6)
}
