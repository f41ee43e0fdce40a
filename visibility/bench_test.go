package visibility

import "testing"

// BenchmarkSeasonAlmanac makes the nights, Sun intervals and almanacs of 182
// nights at 6 sites from nothing.
func BenchmarkSeasonAlmanac(b *testing.B) {
	for b.Loop() {
		e := exactWith(0)
		for i := range 6 {
			s := Site{Latitude: float64(i-3) * 0.3, Longitude: float64(i), Elevation: 2000}
			for d := int32(20850); d < 20850+182; d++ {
				e.Almanac(s, d)
				e.SunBelow(s, e.Night(s, d), -15*degree)
			}
		}
	}
}

// BenchmarkExactStar places one star at one site and a new instant each time.
func BenchmarkExactStar(b *testing.B) {
	e := exactWith(0)
	s, p := Site{0.5, 1, 2000}, Position{RA: 1, Dec: 0.2}
	unix := 1.8e9
	for b.Loop() {
		unix += 10
		e.Star(s, p, unix)
	}
}

// BenchmarkExactMoon is the same for the Moon.
func BenchmarkExactMoon(b *testing.B) {
	e := exactWith(0)
	s := Site{0.5, 1, 2000}
	unix := 1.8e9
	for b.Loop() {
		unix += 10
		e.Moon(s, unix)
	}
}

// BenchmarkKernels fills grids that stay in cache.
func BenchmarkKernels(b *testing.B) {
	e := exactWith(0)
	const fields, slots = 1000, 144
	d := NewDirections(e, scatter(fields), 1.8e9, 1.8e9+86400)
	h := NewHorizons(e, kernelSites[0], 1.8e9, 600, slots)
	alt, az := make([]float64, fields*slots), make([]float64, fields*slots)
	bits := make([]uint64, fields*h.AboveWords())
	rate := func(b *testing.B) {
		b.ReportMetric(float64(b.N)*fields*slots/b.Elapsed().Seconds()/1e6, "Mcell/s")
	}
	b.Run("altaz", func(b *testing.B) {
		for b.Loop() {
			d.AltAz(h, 0, fields, alt, az)
		}
		rate(b)
	})
	b.Run("above", func(b *testing.B) {
		for b.Loop() {
			d.Above(h, 0.5, 0, fields, bits)
		}
		rate(b)
	})
}
