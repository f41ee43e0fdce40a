package weather

import (
	"math"
	"testing"

	"nightwright/constraints/survey"
)

func flat(site string, p, persistence float64) Climate {
	c := Climate{Site: site, Persistence: persistence}
	for m := range c.Clear {
		c.Clear[m] = p
	}
	return c
}

// first is 2027-01-01 00:00 UTC in hours.
const first = 499656

// TestChainAgainstClosedForms draws a long sky and compares with the closed
// forms of a two-state chain: share p, correlation r^k, geometric runs
// (Kemeny & Snell 1960). Tolerances are four standard errors; for correlated
// draws the variance of a mean grows by (1+r)/(1-r) (elementary).
func TestChainAgainstClosedForms(t *testing.T) {
	for _, tt := range []struct{ p, persistence float64 }{{0.6, 14 * 3600}, {0.35, 5 * 3600}, {0.9, 40 * 3600}} {
		const hours = 1 << 20
		c := flat("Cinder Ridge", tt.p, tt.persistence)
		s := NewSky([]Climate{c}, first, hours)
		s.Draw(7, 0)
		r, n := c.Keep(), float64(hours)
		x := make([]float64, hours)
		mean := 0.0
		for k := range x {
			if s.Open(0, first+int64(k)) {
				x[k] = 1
				mean += 1 / n
			}
		}
		v := tt.p * (1 - tt.p)
		within := func(what string, got, want, tol float64) {
			t.Helper()
			if !(math.Abs(got-want) <= tol) {
				t.Errorf("p %g persistence %g h: %s is %.5f; want %.5f to %.5f", tt.p, tt.persistence/3600, what, got, want, tol)
			}
		}
		within("open share", mean, tt.p, 4*math.Sqrt(v/n*(1+r)/(1-r)))
		for _, k := range []int{1, 2, 5, 12, 24} {
			sum := 0.0
			for i := range hours - k {
				sum += (x[i] - tt.p) * (x[i+k] - tt.p)
			}
			within("correlation", sum/float64(hours-k)/v, math.Pow(r, float64(k)), 4*math.Sqrt(2*(1+r*r)/(1-r*r)/n)+0.01)
		}
		open, closed := MeanRuns(tt.p, r)
		counts, total := [2]float64{}, [2]float64{}
		for i, start := 1, 0; i < hours; i++ {
			if x[i] != x[i-1] {
				counts[int(x[i-1])]++
				total[int(x[i-1])] += float64(i - start)
				start = i
			}
		}
		within("mean open run", total[1]/counts[1]/open, 1, 4/math.Sqrt(counts[1]))
		within("mean closed run", total[0]/counts[0]/closed, 1, 4/math.Sqrt(counts[0]))
	}
}

func TestMonthsFollowTheirShares(t *testing.T) {
	c := Climate{Site: "Salt Mesa", Persistence: 6 * 3600, Clear: [12]float64{0, 1, 0.5, 0.5, 0.5, 0.5, 0.5, 0.5, 0.5, 0.5, 0.5, 1}}
	s := NewSky([]Climate{c}, first, 59*24)
	s.Draw(1, 4)
	open := 0
	for k := range int64(31 * 24) {
		if s.Open(0, first+k) {
			open++
		}
	}
	if open != 0 {
		t.Errorf("%d open hours in a January with clear fraction 0", open)
	}
	// Two days into February the old state is forgotten but for exp(-8).
	for k := int64(33 * 24); k < 59*24; k++ {
		if !s.Open(0, first+k) {
			t.Fatalf("hour %d of February is closed; its clear fraction is 1", k)
		}
	}
}

// TestStreamsAreKeyedByName: adding, removing and reordering sites leaves the
// skies of the others as they were.
func TestStreamsAreKeyedByName(t *testing.T) {
	a, b, c := flat("A", 0.6, 40000), flat("B", 0.6, 40000), flat("C", 0.4, 20000)
	a.Region, a.Correlation, b.Region, b.Correlation = "west", 0.5, "west", 0.5
	const hours = 2000
	alone := NewSky([]Climate{b}, first, hours)
	all := NewSky([]Climate{c, a, b}, first, hours)
	for realisation := range uint64(3) {
		alone.Draw(9, realisation)
		all.Draw(9, realisation)
		same := 0
		for k := range int64(hours) {
			if alone.Open(0, first+k) != all.Open(2, first+k) {
				t.Fatalf("realisation %d, hour %d: B's sky depends on its neighbours", realisation, k)
			}
			if all.Open(1, first+k) == all.Open(2, first+k) {
				same++
			}
		}
		if same == hours {
			t.Error("A and B have one sky")
		}
	}
	other := NewSky([]Climate{b}, first, hours)
	other.Draw(9, 1)
	alone.Draw(10, 1)
	differs := 0
	for k := range int64(hours) {
		if other.Open(0, first+k) != alone.Open(0, first+k) {
			differs++
		}
	}
	if differs == 0 {
		t.Error("seeds 9 and 10 draw the same sky")
	}
}

// TestRegionsCorrelate compares with the correlation that was asked for, which
// the solution of the pair's chain promises for equal sites; each site's own
// chain must stay as it is.
func TestRegionsCorrelate(t *testing.T) {
	for _, rho := range []float64{0, 0.3, 0.8, 1} {
		a, b := flat("A", 0.6, 14*3600), flat("B", 0.6, 14*3600)
		a.Region, a.Correlation, b.Region, b.Correlation = "west", rho, "west", rho
		const hours = 1 << 19
		s := NewSky([]Climate{a, b}, first, hours)
		s.Draw(3, 1)
		sum, mean, lag := 0.0, 0.0, 0.0
		at := func(site int, k int64) float64 {
			if s.Open(site, first+k) {
				return 1
			}
			return 0
		}
		for k := range int64(hours - 1) {
			sum += (at(0, k) - 0.6) * (at(1, k) - 0.6)
			mean += at(1, k)
			lag += (at(1, k) - 0.6) * (at(1, k+1) - 0.6)
		}
		r, n := a.Keep(), float64(hours-1)
		tol := 4 * math.Sqrt((1+r*r)/(1-r*r)/n)
		if got := sum / n / 0.24; math.Abs(got-rho) > tol+0.02*rho {
			t.Errorf("correlation %g came out as %.4f", rho, got)
		}
		if got := mean / n; math.Abs(got-0.6) > 4*math.Sqrt(0.24/n*(1+r)/(1-r)) {
			t.Errorf("correlation %g: the open share is %.4f; want 0.6", rho, got)
		}
		if got := lag / n / 0.24; math.Abs(got-r) > 0.01 {
			t.Errorf("correlation %g: lag 1 is %.4f; want %.4f", rho, got, r)
		}
	}
}

func TestLevelsScaleQuality(t *testing.T) {
	c := flat("A", 0.7, 30000)
	c.Levels, c.LevelPersistence = []survey.SkyLevel{{Share: 0.2, Extinction: 0.5}, {Share: 0.3, Seeing: 1.25}}, 3*3600
	// 10^(-0.8 x 0.5) and 1.25^-2, worked by hand.
	if got := Factor(c.Levels[0]); math.Abs(got-0.398107) > 1e-6 {
		t.Errorf("half a magnitude of cloud: %g", got)
	}
	if got := Factor(c.Levels[1]); math.Abs(got-0.64) > 1e-12 {
		t.Errorf("seeing 1.25: %g", got)
	}
	if got, want := c.MeanFactor(), 0.2*0.398107+0.3*0.64+0.5; math.Abs(got-want) > 1e-6 {
		t.Errorf("mean factor %g; want %g", got, want)
	}
	const hours = 1 << 19
	s := NewSky([]Climate{c}, first, hours)
	s.Draw(2, 2)
	sum, open := 0.0, 0.0
	for k := range int64(hours) {
		f := s.Factor(0, first+k)
		if (f > 0) != s.Open(0, first+k) {
			t.Fatal("factor and state disagree")
		}
		if f > 0 {
			open++
			sum += f
		}
	}
	if got := sum / open; math.Abs(got-c.MeanFactor()) > 0.01 {
		t.Errorf("mean factor of the draws is %.4f; want %.4f", got, c.MeanFactor())
	}
}

// TestForecastIsTheChainsMean compares the conditional mean with a mean over
// many realisations, and with p + (x - p) r^k.
func TestForecastIsTheChainsMean(t *testing.T) {
	c := flat("A", 0.6, 10*3600)
	r := c.Keep()
	p := make([]float64, 48)
	for state := range 2 {
		c.Forecast(p, first, state)
		for k := range p {
			if want := 0.6 + (float64(state)-0.6)*math.Pow(r, float64(k+1)); math.Abs(p[k]-want) > 1e-12 {
				t.Fatalf("state %d, hour %d: %g; want %g", state, k, p[k], want)
			}
		}
	}
	c.Forecast(p, first, -1)
	if math.Abs(p[0]-0.6) > 1e-12 || math.Abs(p[47]-0.6) > 1e-12 {
		t.Errorf("without a state: %g, %g; want 0.6", p[0], p[47])
	}
	s := NewSky([]Climate{c}, first-1, 60)
	seen, open := 0.0, 0.0
	for k := range uint64(4000) {
		s.Draw(5, k)
		if s.Open(0, first-1) {
			seen++
			if s.Open(0, first+9) {
				open++
			}
		}
	}
	c.Forecast(p, first, 1)
	if got := open / seen; math.Abs(got-p[9]) > 4*math.Sqrt(0.25/seen) {
		t.Errorf("ten hours after an open one %.3f are open; want %.3f", got, p[9])
	}
}
