package visibility

import (
	"fmt"
	"math"
	"testing"
)

// scatter spreads n positions evenly over the sphere.
func scatter(n int) []Position {
	out := make([]Position, n)
	for i := range out {
		out[i] = Position{
			RA:  math.Mod(float64(i)*math.Pi*(3-math.Sqrt(5)), 2*math.Pi),
			Dec: math.Asin(1 - (2*float64(i)+1)/float64(n)),
		}
	}
	return out
}

var kernelSites = []Site{
	{0.55, -1.86, 2140}, {-0.41, -1.19, 2950}, {0, 3, 0}, {1.39, 0.3, 10},
	{math.Pi / 2, 0, 0}, {-math.Pi / 2, math.Pi, 2835},
}

// TestKernelAltAz compares the grid path with the exact path on the sky, over
// the whole sphere and a day, more than 10 deg from the Sun.
func TestKernelAltAz(t *testing.T) {
	e := exactWith(0.2)
	const from, step, slots = 1.801e9, 600.0, 145
	fields := scatter(400)
	fields[0] = Position{RA: 1, Dec: math.Pi / 2}
	fields[1] = Position{RA: 1, Dec: -math.Pi / 2}
	fields[2] = Position{RA: 4, Dec: 0.55, PMRA: 1e-5, PMDec: -2e-5}
	d := NewDirections(e, fields, from, from+86400)
	alt, az := make([]float64, len(fields)*slots), make([]float64, len(fields)*slots)
	var whole, high worst
	cells := 0
	for si, s := range kernelSites {
		h := NewHorizons(e, s, from, step, slots)
		d.AltAz(h, 0, len(fields), alt, az)
		for k := 0; k < slots; k += 3 {
			n := e.At(from + float64(k)*step)
			sun := n.Sun(s)
			for i, p := range fields {
				c := i*slots + k
				if !(az[c] >= 0 && az[c] < 2*math.Pi && math.Abs(alt[c]) <= math.Pi/2) {
					t.Fatalf("site %d field %d slot %d: altitude %v azimuth %v", si, i, k, alt[c], az[c])
				}
				x := n.Star(s, p)
				if Separation(x, sun.Horizontal) < 10*degree {
					continue
				}
				cells++
				at := fmt.Sprintf("site %d field %d slot %d", si, i, k)
				whole.see(arcsec(angle(seen(alt[c], az[c]), x.Direction)), at)
				if x.Altitude > 80*degree {
					high.see(arcsec(alt[c]-x.Altitude), at)
				}
			}
		}
	}
	if cells < 90000 {
		t.Errorf("only %d cells", cells)
	}
	whole.check(t, "on the sky, arcsec", 0.03)
	high.check(t, "altitude above 80 deg, arcsec", 0.03)
}

// TestKernelZenith drives fields through the zenith and the nadir.
func TestKernelZenith(t *testing.T) {
	e := exactWith(0)
	s := Site{0.55, -1.86, 2140}
	n := e.At(1.81e9)
	var w worst
	for _, off := range []float64{0, 1e-9, -1e-7, 1e-5, 1e-3} {
		for _, side := range []float64{0, math.Pi} {
			lat := s.Latitude
			if side != 0 {
				lat = -lat
			}
			p := icrsOfDate(n, wrapTurn(n.Rotation+s.Longitude+side), lat+off)
			d := NewDirections(e, []Position{p}, 1.81e9-3600, 1.81e9+3600)
			h := NewHorizons(e, s, 1.81e9-20, 1, 41)
			alt, az := make([]float64, 41), make([]float64, 41)
			d.AltAz(h, 0, 1, alt, az)
			for k := range alt {
				x := e.Star(s, p, 1.81e9-20+float64(k))
				w.see(arcsec(angle(seen(alt[k], az[k]), x.Direction)), fmt.Sprint(off, side, k))
			}
		}
	}
	w.check(t, "at zenith and nadir, arcsec", 0.03)
}

// TestArcTables bounds the error of the two arc functions over their range.
func TestArcTables(t *testing.T) {
	var sine, tangent worst
	const n = 200_000
	for k := -n; k <= n; k++ {
		x := float64(k) / n
		tangent.see(arcTangent(x)-math.Atan(x), fmt.Sprint(x))
		x *= arcSplit * 1.002 // the zenith branch starts a little beyond the split
		sine.see(arcSine(x*sineScale)-math.Asin(x), fmt.Sprint(x))
	}
	sine.check(t, "arc sine, rad", 6e-9)
	tangent.check(t, "arc tangent, rad", 3e-9)
	if z := arcTangent(0); z != 0 {
		t.Errorf("arc tangent of 0 is %g", z)
	}
	for k := range 1000 {
		if x := float64(k) * 1e-6; arcTangent(x) < 0 {
			t.Errorf("arc tangent of %g is below 0", x)
		}
	}
}

// TestKernelAbove compares every bit with the exact path; only cells within
// 0.03" of the limit may differ.
func TestKernelAbove(t *testing.T) {
	e := exactWith(-0.3)
	const from = 1.8095e9
	fields := scatter(300)
	for _, step := range []float64{30, 600, 900, 1800, 3600} {
		slots := int(86400/step) + 1
		if slots > 300 {
			slots = 300
		}
		d := NewDirections(e, fields, from, from+86400)
		for si, s := range kernelSites {
			h := NewHorizons(e, s, from, step, slots)
			words := h.AboveWords()
			bits := make([]uint64, len(fields)*words)
			for i := range bits {
				bits[i] = 0xdeadbeef // what was there before doesn't matter
			}
			for _, limit := range []float64{0, 20, 30, 75} {
				sin := math.Sin(limit * degree)
				d.Above(h, sin, 0, len(fields), bits)
				set, want := 0, 0
				for k := 0; k < slots; k += 7 {
					n := e.At(from + float64(k)*step)
					for i, p := range fields {
						x := n.Star(s, p)
						got := bits[i*words+k/64]>>(k%64)&1 == 1
						off := x.Altitude/degree - limit
						if got {
							set++
						}
						if off >= 0 {
							want++
						}
						if got != (off >= 0) && math.Abs(off)*3600 > 0.03 {
							t.Fatalf("step %g site %d field %d slot %d limit %g: %v, %g deg over", step, si, i, k, limit, got, off)
						}
					}
				}
				if want == 0 || math.Abs(float64(set-want)) > 2 {
					t.Errorf("step %g site %d limit %g: %d bits, want %d", step, si, limit, set, want)
				}
				for i := range fields {
					if left := slots % 64; left != 0 && bits[i*words+words-1]>>left != 0 {
						t.Fatalf("bits beyond the last slot are set")
					}
				}
			}
		}
	}
}

// TestKernelParts: a part of the fields gives the same bits as the whole, and
// no slots or fields are no trouble.
func TestKernelParts(t *testing.T) {
	e := exactWith(0)
	fields := scatter(50)
	d := NewDirections(e, fields, 1.8e9, 1.8e9+86400)
	h := NewHorizons(e, kernelSites[0], 1.8e9, 600, 100)
	if d.Len() != 50 || h.Len() != 100 {
		t.Fatalf("%d fields, %d slots", d.Len(), h.Len())
	}
	alt, az := make([]float64, 5000), make([]float64, 5000)
	d.AltAz(h, 0, 50, alt, az)
	a, z := make([]float64, 1000), make([]float64, 1000)
	d.AltAz(h, 20, 30, a, z)
	for i := range a {
		if a[i] != alt[2000+i] || z[i] != az[2000+i] {
			t.Fatalf("cell %d differs in a part", i)
		}
	}
	whole, part := make([]uint64, 100), make([]uint64, 20)
	d.Above(h, 0.5, 0, 50, whole)
	d.Above(h, 0.5, 20, 30, part)
	for i := range part {
		if part[i] != whole[40+i] {
			t.Fatalf("word %d differs in a part", i)
		}
	}
	none := NewHorizons(e, kernelSites[0], 1.8e9, 600, 0)
	d.Above(none, 0.5, 0, 50, nil)
	d.AltAz(none, 0, 50, nil, nil)
	NewDirections(e, nil, 1.8e9, 1.9e9).AltAz(h, 0, 0, nil, nil)
}

// TestKernelReference: the grid path within 0.1" of ERFA's atco13 more than
// 10 deg from the Sun, each row in the middle of a night's grid.
func TestKernelReference(t *testing.T) {
	var w worst
	n := 0
	for _, r := range table(t, "altaz_public.csv") {
		e, s, unix := exactWith(r.num(t, "dut1_s")), r.site(t), r.unix(t)
		p := Position{RA: r.rad(t, "ra_icrs_deg"), Dec: r.rad(t, "dec_icrs_deg")}
		if Separation(e.Star(s, p, unix), e.Sun(s, unix).Horizontal) < 10*degree {
			continue
		}
		n++
		d := NewDirections(e, []Position{p}, unix-43200, unix+43200)
		h := NewHorizons(e, s, unix-600*40, 600, 73)
		var alt, az [73]float64
		d.AltAz(h, 0, 1, alt[:], az[:])
		w.see(arcsec(angle(seen(alt[40], az[40]), seen(r.rad(t, "alt_deg"), r.rad(t, "az_deg")))), r["id"]+" "+r["kind"])
	}
	if n < 1900 {
		t.Errorf("%d rows", n)
	}
	w.check(t, "grid path, arcsec", 0.1)
}
