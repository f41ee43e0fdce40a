package visibility

import (
	"os"
	"os/exec"
	"path/filepath"
	"runtime"
	"strconv"
	"strings"
	"testing"
	"time"
)

// The grid of the speed comparison: as many fields as a large survey, a night
// of ten-minute slots.
const (
	benchFields = 6000
	benchSlots  = 72
	benchStart  = 1.8e9
	benchStep   = 600.0
)

var benchSite = Site{0.55, -1.86, 2140}

// outside is what another program made of the same grid: its speed and a
// sample of its cells.
type outside struct {
	rate    float64 // cells per second
	alt, az []float64
}

// runOutside runs a comparison program on the grid.
func runOutside(t testing.TB, fields, rounds int, form string, command ...string) outside {
	t.Helper()
	f := func(x float64) string { return strconv.FormatFloat(x, 'g', 17, 64) }
	args := append(command[1:], strconv.Itoa(fields), strconv.Itoa(benchSlots), f(benchStart), f(benchStep),
		f(benchSite.Latitude), f(benchSite.Longitude), f(benchSite.Elevation), strconv.Itoa(rounds))
	if form != "" {
		args = append(args, form)
	}
	cmd := exec.Command(command[0], args...)
	cmd.Env = append(os.Environ(), "OMP_NUM_THREADS=1", "OPENBLAS_NUM_THREADS=1")
	out, err := cmd.Output()
	if err != nil {
		t.Fatalf("%v: %v", command, err)
	}
	var o outside
	for i, line := range strings.Split(strings.TrimSpace(string(out)), "\n") {
		words := strings.Fields(line)
		if i == 0 {
			o.rate = parse(t, words[0])
			continue
		}
		o.alt = append(o.alt, parse(t, words[0]))
		o.az = append(o.az, parse(t, words[1]))
	}
	return o
}

// atioq compiles and runs the C program over ERFA.
func atioq(t testing.TB, rounds int) outside {
	t.Helper()
	gcc, err := exec.LookPath("gcc")
	if err != nil {
		needs(t, "no gcc")
	}
	program := filepath.Join(t.TempDir(), "atioq_bench")
	out, err := exec.Command(gcc, "-O2", "-o", program, "testdata/atioq_bench.c", "-lerfa", "-lm").CombinedOutput()
	if err != nil {
		needs(t, "the C comparison doesn't compile (Debian: liberfa-dev): "+string(out))
	}
	return runOutside(t, benchFields, rounds, "", program)
}

// farthest is the greatest distance of the sample from our grid, arcsec.
func (o outside) farthest(alt, az []float64) float64 {
	far := 0.0
	for i := range o.alt {
		c := 997 * i
		far = max(far, arcsec(angle(seen(alt[c], az[c]), seen(o.alt[i], o.az[i]))))
	}
	return far
}

// TestGridLikeERFA: the C program's grid and ours are the same to 0.15": it
// holds each field's place for the night and leaves 0.1" of drift in.
func TestGridLikeERFA(t *testing.T) {
	o := atioq(t, 1)
	if len(o.alt) != (benchFields*benchSlots+996)/997 {
		t.Fatalf("%d cells", len(o.alt))
	}
	alt, az := benchGrid(t)
	if far := o.farthest(alt, az); !(far < 0.15) {
		t.Errorf("%g\" from ERFA's atioq", far)
	} else {
		t.Logf("within %.3g\" of ERFA's atioq", far)
	}
}

// benchGrid fills the grid of the comparison once.
func benchGrid(t testing.TB) (alt, az []float64) {
	t.Helper()
	e := exactWith(0)
	d := NewDirections(e, scatter(benchFields), benchStart, benchStart+benchStep*benchSlots)
	h := NewHorizons(e, benchSite, benchStart, benchStep, benchSlots)
	alt, az = make([]float64, benchFields*benchSlots), make([]float64, benchFields*benchSlots)
	d.AltAz(h, 0, benchFields, alt, az)
	return alt, az
}

// writeSpeed measures how fast one core fills memory, bytes per second: the
// best of eight passes over 256 MB.
func writeSpeed() float64 {
	buf := make([]uint64, 32<<20)
	best := time.Duration(1 << 62)
	for range 8 {
		t := time.Now()
		clear(buf)
		best = min(best, time.Since(t))
	}
	runtime.KeepAlive(buf)
	return float64(8*len(buf)) / best.Seconds()
}

// BenchmarkGrid is the speed comparison, one core, everything in this run:
//
//	go test ./visibility -run '^$' -bench Grid
//
// x-atioq and x-astropy are how many times more cells a second ours fills
// than the C program over ERFA's atioq and than astropy's vectorised AltAz in
// its fastest form, coordinates and instants broadcast against each other;
// x-astropy-cells is against AltAz of a table with an instant in each row.
// write-% is the part of the machine's memory-write speed.
func BenchmarkGrid(b *testing.B) {
	python := pythonWith(b, "astropy")
	c := atioq(b, 5)
	py := runOutside(b, benchFields, 3, "", python, "testdata/altaz_bench.py")
	cells := runOutside(b, 100, 2, "cells", python, "testdata/altaz_bench.py")
	alt, az := benchGrid(b)
	if far := c.farthest(alt, az); far > 0.15 {
		b.Fatalf("%g\" from the C program", far)
	}
	if far := py.farthest(alt, az); far > 1 { // astropy puts in 0.6" of polar motion
		b.Fatalf("%g\" from astropy", far)
	}
	memory := writeSpeed()
	e := exactWith(0)
	d := NewDirections(e, scatter(benchFields), benchStart, benchStart+benchStep*benchSlots)
	h := NewHorizons(e, benchSite, benchStart, benchStep, benchSlots)
	report := func(b *testing.B, bytes float64) {
		rate := benchFields * benchSlots * float64(b.N) / b.Elapsed().Seconds()
		b.ReportMetric(rate/1e6, "Mcell/s")
		b.ReportMetric(rate/c.rate, "x-atioq")
		b.ReportMetric(rate/py.rate, "x-astropy")
		b.ReportMetric(rate/cells.rate, "x-astropy-cells")
		b.ReportMetric(100*rate*bytes/memory, "write-%")
		b.ReportMetric(0, "ns/op")
	}
	b.Run("outside", func(b *testing.B) {
		for b.Loop() { // nothing to time: a carrier for the numbers
		}
		b.ReportMetric(0, "ns/op")
		b.ReportMetric(c.rate/1e6, "atioq-Mcell/s")
		b.ReportMetric(py.rate/1e6, "astropy-Mcell/s")
		b.ReportMetric(cells.rate/1e6, "astropy-cells-Mcell/s")
		b.ReportMetric(memory/1e9, "write-GB/s")
	})
	b.Run("altaz", func(b *testing.B) {
		for b.Loop() {
			d.AltAz(h, 0, benchFields, alt, az)
		}
		report(b, 16)
	})
	b.Run("above", func(b *testing.B) {
		bits := make([]uint64, benchFields*h.AboveWords())
		for b.Loop() {
			d.Above(h, 0.5, 0, benchFields, bits)
		}
		report(b, 1./8)
	})
}
