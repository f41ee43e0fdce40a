package visibility

import (
	"fmt"
	"math"
	"math/rand/v2"
	"testing"

	"nightwright/visibility/ephemeris"
)

// trialSky is a period of a few days with sites and fields anywhere.
type trialSky struct {
	exact   *Exact
	sky     *Sky
	sites   []Site
	places  []Position
	filters []Filter
	from    float64
	r       *rand.Rand
}

func newTrialSky(seed uint64) *trialSky {
	s := &trialSky{r: rand.New(rand.NewPCG(seed, 21))}
	s.exact = NewExact(ephemeris.NewClock(nil, ephemeris.Orientation{DUT1: s.between(-0.8, 0.8)}))
	s.from = math.Floor(s.between(20454, 24106)) * 86400 // 2026 to 2035
	for _, at := range [][2]float64{{90, 0}, {-90, 12}, {0, 180}, {33, -180}, {-89.999, 77}} {
		s.sites = append(s.sites, Site{Latitude: at[0] * degree, Longitude: at[1] * degree, Elevation: s.between(0, 5000)})
	}
	for range 5 {
		s.sites = append(s.sites, Site{Latitude: math.Asin(s.between(-1, 1)), Longitude: s.between(-180, 180) * degree})
	}
	for range 60 {
		s.places = append(s.places, Position{
			RA: s.between(0, 2*math.Pi), Dec: math.Asin(s.between(-1, 1)),
			// Up to the largest known, 10" a year.
			PMRA: s.between(-1, 1) * 5e-5 * float64(s.r.IntN(2)), PMDec: s.between(-1, 1) * 5e-5 * float64(s.r.IntN(2)),
		})
	}
	s.places = append(s.places, Position{Dec: math.Pi / 2}, Position{Dec: -math.Pi / 2}, Position{RA: 1, Dec: 89.9 * degree})
	for band := BandU; band <= BandI; band++ {
		s.filters = append(s.filters, Filter{Name: fmt.Sprint(band), Band: band, Extinction: s.between(0.02, 0.6), DarkSky: s.between(19, 23), Moonlight: s.between(0, 2)})
	}
	s.sky = NewSky(s.exact, s.sites, s.filters, s.places, s.from, s.from+3*86400, 2)
	return s
}

func (s *trialSky) between(lo, hi float64) float64 { return lo + (hi-lo)*s.r.Float64() }

// TestSkyAgreesWithExact: the fast path is within 0.05" of the exact one for
// fields more than 10 deg from the Sun, in every coordinate it gives, and
// within 1" for Sun and Moon. Angles are measured on the sky, for an azimuth
// means nothing at the zenith, nor an hour angle at the pole.
func TestSkyAgreesWithExact(t *testing.T) {
	var sine, place, hour, dec, sun, moon, lit, axes worst
	for seed := range uint64(boundRounds(12, 300)) {
		s := newTrialSky(seed)
		for range 120 {
			at := s.from + s.between(0, 3*86400)
			i := s.r.IntN(len(s.sites))
			fr, now := s.sky.Frame(i, at), s.exact.At(at)
			what := fmt.Sprintf("seed %d, site %d, %.3f", seed, i, at)
			wantSun, wantMoon := now.Sun(s.sites[i]), now.Moon(s.sites[i])
			sun.see(arcsec(angle(fr.horizontal(fr.Sun), wantSun.Direction)), what)
			moon.see(arcsec(angle(fr.horizontal(fr.Moon), wantMoon.Direction)), what)
			lit.see(fr.Illumination-wantMoon.Illumination, what)
			axes.see(fr.Zenith.Dot(fr.East), what)
			axes.see(fr.East.Cross(fr.North).Sub(fr.Zenith).Norm(), what)
			for range 20 {
				f := s.r.IntN(len(s.places))
				want := now.Star(s.sites[i], s.places[f])
				if Separation(want, wantSun.Horizontal) < 10*degree {
					continue
				}
				what := fmt.Sprintf("%s, field %d", what, f)
				c := s.sky.Direction(f, at)
				alt, az := fr.AltAz(c)
				place.see(arcsec(angle(seen(alt, az), want.Direction)), what)
				// A sine's error on the sky; near the zenith it says little.
				if cos := math.Cos(want.Altitude); cos > 0.01 {
					sine.see(arcsec((fr.SinAltitude(c)-math.Sin(want.Altitude))/cos), what)
				}
				hour.see(arcsec(turnDiff(fr.HourAngle(c), want.HourAngle))*math.Cos(want.Declination), what)
				dec.see(arcsec(fr.Declination(c)-want.Declination), what)
				h := s.sky.Horizon(i, at)
				if h.SinAltitude(c) != fr.SinAltitude(c) || h.HourAngle(c) != fr.HourAngle(c) {
					t.Fatalf("%s: Horizon and Frame disagree", what)
				}
			}
		}
	}
	place.check(t, "altitude and azimuth, arcsec", 0.05)
	sine.check(t, "sine of the altitude, arcsec", 0.05)
	hour.check(t, "hour angle on the sky, arcsec", 0.05)
	dec.check(t, "declination, arcsec", 0.05)
	sun.check(t, "Sun, arcsec", 1)
	moon.check(t, "Moon, arcsec", 1)
	lit.check(t, "lit fraction", 1e-4)
	axes.check(t, "axes", 1e-14)
}

// horizontal takes a direction to the horizon frame: east, north, up.
func (fr *Frame) horizontal(c ephemeris.Vec) ephemeris.Vec {
	return ephemeris.Vec{fr.East.Dot(c), fr.North.Dot(c), fr.Zenith.Dot(c)}.Unit()
}

// skyAt counts what kinds of sky were met.
type skyAt struct{ dark, moonlit, twilight, low, near int }

// TestSkyQuality holds the tables of quality against the plain formula on the
// exact path, for every kind of sky.
func TestSkyQuality(t *testing.T) {
	var high, low, near worst
	var met skyAt
	for seed := range uint64(boundRounds(12, 300)) {
		s := newTrialSky(seed + 1000)
		for range 150 {
			at := s.from + s.between(0, 3*86400)
			i := s.r.IntN(len(s.sites))
			fr, now := s.sky.Frame(i, at), s.exact.At(at)
			sun, moon := now.Sun(s.sites[i]), now.Moon(s.sites[i])
			if sun.Altitude > -5*degree {
				continue // never legal
			}
			if math.Abs(moon.Altitude) < 5e-6 {
				continue // moonlight switches on within the Moon's error, 1"
			}
			for range 20 {
				f := s.r.IntN(len(s.places))
				star := now.Star(s.sites[i], s.places[f])
				g := Geometry{
					SinAltitude: math.Sin(star.Altitude), SunAltitude: sun.Altitude, MoonAltitude: moon.Altitude,
					MoonSeparation: Separation(star, moon.Horizontal), MoonPhaseAngle: moon.PhaseAngle,
				}
				c := s.sky.Direction(f, at)
				for k := range s.filters {
					got, want := s.sky.Quality(&fr, k, c), Quality(s.filters[k], g)
					what := fmt.Sprintf("seed %d, site %d, field %d, filter %d, %.3f: %.7f for %.7f (altitude %.3f, Sun %.3f, Moon %.3f, separation %.3f deg)",
						seed, i, f, k, at, got, want, star.Altitude/degree, sun.Altitude/degree, moon.Altitude/degree, g.MoonSeparation/degree)
					if got < 0 || got > 1 || got != s.sky.LitQuality(&fr, k, s.sky.Light(&fr, k), c) {
						t.Fatal(what)
					}
					switch {
					case moon.Altitude > 0 && math.Abs(g.MoonSeparation-10*degree) < 1e-5:
						continue // the published function jumps here
					case moon.Altitude > 0 && g.MoonSeparation < 2*degree:
						near.see(got-want, what)
						met.near++
					case g.SinAltitude > 0 && g.SinAltitude < 0.05:
						low.see(got-want, what)
						met.low++
					default:
						high.see(got-want, what)
					}
					if g.SinAltitude < 0.05 {
						continue
					}
					switch {
					case sun.Altitude > -16*degree:
						met.twilight++
					case moon.Altitude > 0:
						met.moonlit++
					default:
						met.dark++
					}
				}
			}
		}
	}
	high.check(t, "quality", 2e-5)
	low.check(t, "quality under 3 deg", 2e-5)
	near.check(t, "quality within 2 deg of the Moon", 1e-4)
	t.Logf("met: %+v", met)
	if met.dark < 1000 || met.moonlit < 1000 || met.twilight < 1000 || met.low < 200 {
		t.Errorf("too few skies of a kind: %+v", met)
	}
}

// TestSkyForAnyWorkers: the tables don't depend on the number of workers.
func TestSkyForAnyWorkers(t *testing.T) {
	s := newTrialSky(5)
	for _, workers := range []int{1, 3, 8} {
		other := NewSky(s.exact, s.sites, s.filters, s.places, s.from, s.from+3*86400, workers)
		for range 200 {
			at, i, f := s.from+s.between(0, 3*86400), s.r.IntN(len(s.sites)), s.r.IntN(len(s.places))
			if s.sky.Direction(f, at) != other.Direction(f, at) || s.sky.Frame(i, at) != other.Frame(i, at) {
				t.Fatalf("%d workers: another sky", workers)
			}
		}
	}
	if s.sky.Fields() != len(s.places) || s.sky.Sites() != len(s.sites) || s.sky.Filters() != len(s.filters) {
		t.Error("sizes")
	}
}

// TestFrameGrid: a grid's frames and lights are those asked for one by one,
// and it covers what was asked for.
func TestFrameGrid(t *testing.T) {
	s := newTrialSky(6)
	for range 20 {
		from := s.from + s.between(0, 86400)
		to := from + s.between(0, 40000)
		step := []float64{60, 300, 600}[s.r.IntN(3)]
		i := s.r.IntN(len(s.sites))
		g := s.sky.FrameGrid(i, from, to, step)
		if g.From > from || g.From+step*float64(g.Cells()) < to || from-g.From >= step || math.Mod(g.From, step) != 0 {
			t.Fatalf("grid %v + %d x %v for %v to %v", g.From, g.Cells(), step, from, to)
		}
		for k := range g.Frames {
			if g.Frames[k] != s.sky.Frame(i, g.From+float64(k)*step) {
				t.Fatalf("frame %d", k)
			}
			for f := range s.filters {
				if g.Light(k, f) != s.sky.Light(&g.Frames[k], f) {
					t.Fatalf("light %d of filter %d", k, f)
				}
			}
		}
		for range 20 {
			at := from + s.r.Float64()*(to-from)
			if k := g.Cell(at); g.Frames[k].T > at || g.Frames[k+1].T < at {
				t.Fatalf("cell %d holds %v to %v, not %v", k, g.Frames[k].T, g.Frames[k+1].T, at)
			}
		}
	}
}
