package footprint

import (
	"bytes"
	"fmt"
	"math"
	"math/rand/v2"
	"os"
	"os/exec"
	"strings"
	"testing"

	"nightwright/visibility/ephemeris"
)

// python runs a script of Debian's Python with a library and returns what it
// prints; the test is skipped where the library is missing.
func python(t *testing.T, library, script, input string) string {
	t.Helper()
	const interpreter = "/usr/bin/python3"
	if err := exec.Command(interpreter, "-c", "import "+library).Run(); err != nil {
		if os.Getenv("NIGHTWRIGHT_REQUIRE_ALL") == "1" {
			t.Fatalf("%s can't import %s: %v", interpreter, library, err)
		}
		t.Skipf("%s can't import %s; on Debian: apt-get install python3-astropy-healpix", interpreter, library)
	}
	cmd := exec.Command(interpreter, "-c", script)
	cmd.Stdin = strings.NewReader(input)
	var out, msg bytes.Buffer
	cmd.Stdout, cmd.Stderr = &out, &msg
	if err := cmd.Run(); err != nil {
		t.Fatalf("%v\n%s", err, msg.String())
	}
	return out.String()
}

// TestHEALPixAgainstAstropy compares cells of random directions, and centres
// and corners of random cells, with astropy-healpix (Debian's
// python3-astropy-healpix 0.6) at all orders.
func TestHEALPixAgainstAstropy(t *testing.T) {
	rng := rand.New(rand.NewPCG(1, 1))
	var in strings.Builder
	type row struct {
		ra, dec float64
		cell    Cell
	}
	var rows []row
	for order := 0; order <= MaxOrder; order++ {
		for k := range 100 {
			dec := math.Asin(2*rng.Float64() - 1)
			if k%4 == 0 { // near the poles
				dec = math.Copysign(math.Pi/2-rng.Float64()*math.Pow(10, -float64(k%9)), rng.Float64()-0.5)
			}
			r := row{2 * math.Pi * rng.Float64(), dec, Cell{order, rng.Int64N(CellCount(order))}}
			rows = append(rows, r)
			fmt.Fprintf(&in, "%d %.17g %.17g %d\n", order, r.ra, r.dec, r.cell.Index)
		}
	}
	out := python(t, "astropy_healpix", `
import sys, numpy as np
from astropy_healpix import HEALPix
from astropy import units as u
rows = [l.split() for l in sys.stdin]
for order in range(30):
    mine = [r for r in rows if int(r[0]) == order]
    h = HEALPix(nside=2**order, order='nested')
    ra, dec = (np.array([float(r[k]) for r in mine]) for k in (1, 2))
    cell = h.lonlat_to_healpix(ra*u.rad, dec*u.rad)
    at = np.array([int(r[3]) for r in mine])
    lon, lat = h.healpix_to_lonlat(at)
    blon, blat = h.boundaries_lonlat(at, 1)
    for k in range(len(mine)):
        print(cell[k], repr(lon[k].value), repr(lat[k].value), *[repr(x.value) for p in range(4) for x in (blon[k][p], blat[k][p])])
`, in.String())
	lines := strings.Split(strings.TrimSpace(out), "\n")
	if len(lines) != len(rows) {
		t.Fatalf("%d lines for %d rows", len(lines), len(rows))
	}
	moved, away := 0, 0.0
	for i, line := range lines {
		r := rows[i]
		var cell int64
		var at [5][2]float64 // centre, then corners
		if _, err := fmt.Sscan(line, &cell, &at[0][0], &at[0][1], &at[1][0], &at[1][1], &at[2][0], &at[2][1], &at[3][0], &at[3][1], &at[4][0], &at[4][1]); err != nil {
			t.Fatalf("%q: %v", line, err)
		}
		if got := CellAt(r.cell.Order, Direction(r.ra, r.dec)); got.Index != cell {
			// A cell of order 29 is 4e-4" wide, 2e-9 rad; a direction in
			// float64 is good to 2e-16, so a few in a million may differ.
			if got.Order < 25 {
				t.Errorf("order %d, %.17g %.17g: cell %d, astropy-healpix has %d", r.cell.Order, r.ra, r.dec, got.Index, cell)
			}
			moved++
		}
		if cell < 0 || cell >= CellCount(r.cell.Order) {
			t.Fatalf("astropy-healpix gives cell %d of order %d", cell, r.cell.Order)
		}
		away = max(away, separation(r.cell.Centre(), Direction(at[0][0], at[0][1])))
		// Its corners are in the same sense but may start elsewhere.
		corners := r.cell.Corners()
		for k := range corners {
			near := math.Pi
			for _, b := range at[1:] {
				near = min(near, separation(corners[k], Direction(b[0], b[1])))
			}
			away = max(away, near)
		}
	}
	if away > 1e-14 {
		t.Errorf("a centre or corner is %.2g rad away from astropy-healpix's; want 1e-14 at most", away)
	}
	if moved > 5 {
		t.Errorf("%d of %d directions fall in another cell at the deepest orders; want 5 at most", moved, len(rows))
	}
	t.Logf("%d directions and cells, worst centre or corner %.2g rad, %d in a neighbour's cell", len(rows), away, moved)
}

// TestCoverAgainstAstropy compares the cells of circles with a search by
// astropy-healpix, whose cone search returns all cells that the circle may
// touch: ours, by centre, are those of them whose centre is inside.
func TestCoverAgainstAstropy(t *testing.T) {
	rng := rand.New(rand.NewPCG(2, 1))
	var in strings.Builder
	var circles []Circle
	for range 25 {
		ra, dec, r := 2*math.Pi*rng.Float64(), math.Asin(2*rng.Float64()-1), 0.002+0.3*rng.Float64()*rng.Float64()
		circles = append(circles, Circle{Direction(ra, dec), r})
		fmt.Fprintf(&in, "%.17g %.17g %.17g\n", ra, dec, r)
	}
	const order = 6
	out := python(t, "astropy_healpix", `
import sys, numpy as np
from astropy_healpix import HEALPix
from astropy import units as u
from astropy.coordinates.angle_utilities import angular_separation
h = HEALPix(nside=2**6, order='nested')
for l in sys.stdin:
    ra, dec, r = map(float, l.split())
    cells = h.cone_search_lonlat(ra*u.rad, dec*u.rad, r*u.rad)
    lon, lat = h.healpix_to_lonlat(cells)
    d = angular_separation(lon.value, lat.value, ra, dec)
    print(*sorted(cells[d <= r]))
`, in.String())
	lines := strings.Split(strings.TrimSuffix(out, "\n"), "\n")
	for i, c := range circles {
		var got []string
		for _, cell := range CoverCircles(order, []Circle{c}).Cells() {
			for k := range below(cell.Order) / below(order) {
				got = append(got, fmt.Sprint(cell.Index*(below(cell.Order)/below(order))+k))
			}
		}
		want := strings.Fields(lines[i])
		if len(got) != len(want) {
			t.Errorf("circle %d (radius %.4f): %d cells, astropy-healpix has %d", i, c.Radius, len(got), len(want))
			continue
		}
		in := map[string]bool{}
		for _, w := range want {
			in[w] = true
		}
		for _, g := range got {
			if !in[g] {
				t.Errorf("circle %d: cell %s is not among astropy-healpix's", i, g)
			}
		}
	}
}

func randomDirection(rng *rand.Rand) ephemeris.Vec {
	return Direction(2*math.Pi*rng.Float64(), math.Asin(2*rng.Float64()-1))
}
