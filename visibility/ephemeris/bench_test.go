package ephemeris

import "testing"

// What one evaluation costs; go test -bench . ./visibility/ephemeris

var (
	sinkVec   Vec
	sinkMat   Mat
	sinkFloat float64
)

func BenchmarkCelestialToIntermediate(b *testing.B) {
	t := 0.27
	for b.Loop() {
		sinkMat = CelestialToIntermediate(t)
		t += 1e-7
	}
}

func BenchmarkEarthVelocity(b *testing.B) {
	t := 0.27
	for b.Loop() {
		sinkVec = EarthVelocity(t)
		t += 1e-7
	}
}

func BenchmarkSunGeocentric(b *testing.B) {
	t := 0.27
	for b.Loop() {
		sinkVec = SunGeocentric(t)
		t += 1e-7
	}
}

func BenchmarkMoonGeocentric(b *testing.B) {
	t := 0.27
	for b.Loop() {
		sinkVec = MoonGeocentric(t)
		t += 1e-7
	}
}

func BenchmarkERA(b *testing.B) {
	c := NewClock(nil, Orientation{})
	unix := 1.8e9
	for b.Loop() {
		sinkFloat = c.ERA(unix)
		unix++
	}
}

func BenchmarkERAFromTable(b *testing.B) {
	rows := make([]DUT1Row, 20000)
	for i := range rows {
		rows[i] = DUT1Row{MJD: 45000 + float64(i), DUT1: 0.1}
	}
	c := NewClock(nil, Orientation{Table: rows})
	unix := 1.8e9
	for b.Loop() {
		sinkFloat = c.ERA(unix)
		unix++
	}
}
