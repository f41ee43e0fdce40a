package constraints

import (
	"fmt"
	"math"
	"math/rand/v2"
	"testing"

	"nightwright/constraints/survey"
	"nightwright/visibility"
)

// The oracle of windows is the exact path at plain steps: every instant inside
// a window is legal, and every legal stretch lies within an outer one.

// oddPlaces are where formulas break: poles, polar circle, equator, both ends
// of the date line.
var oddPlaces = []survey.Site{
	{Name: "north pole", Latitude: 90 * deg},
	{Name: "south pole", Latitude: -90 * deg, Longitude: 45 * deg, Elevation: 2800},
	{Name: "polar", Latitude: 78.2 * deg, Longitude: 15.6 * deg},
	{Name: "equator", Latitude: 0, Longitude: 180 * deg, Elevation: 3000},
	{Name: "date line", Latitude: 33 * deg, Longitude: -180 * deg, Elevation: 500},
	{Name: "south", Latitude: -44.5 * deg, Longitude: 170 * deg, Elevation: 1000},
}

func pick[T any](rng *rand.Rand, xs ...T) T { return xs[rng.IntN(len(xs))] }

// randomMount draws one of the mounts the program knows.
func randomMount(rng *rand.Rand, t *survey.Telescope) {
	t.AltitudeMin = pick(rng, 0, 10*deg, 20*deg)
	t.AltitudeMax = pick(rng, 90*deg, 87*deg, 75*deg)
	switch rng.IntN(5) {
	case 0:
		from := rng.Float64() * 360 * deg
		t.AzimuthRange = &survey.AzimuthRange{From: from, To: from + 2*math.Pi}
	case 1:
		from := (rng.Float64() - 0.5) * 720 * deg
		t.AzimuthRange = &survey.AzimuthRange{From: from, To: from + (20+rng.Float64()*330)*deg}
	case 2:
		t.Mount = survey.Equatorial
	case 3:
		t.Mount = survey.Equatorial
		t.Flip = &survey.Flip{Time: 60, PastMeridian: pick(rng, 0, 5*deg, 30*deg)}
	}
}

func randomRules(rng *rand.Rand) survey.Rules {
	return survey.Rules{
		AltitudeMin: pick(rng, -20*deg, 5*deg, 15*deg, 30*deg, 50*deg), AirmassMax: pick(rng, 1.2, 1.8, 2.5, 40),
		SunAltitudeMax:    pick(rng, -5*deg, -12*deg, -15*deg, -18*deg),
		MoonSeparationMin: pick(rng, 0, 25*deg, 60*deg, 130*deg), MoonIlluminationMax: pick(rng, 1, 0.9, 0.5, 0.1),
		HourAngleMax: pick(rng, 12, 5, 2, 0.5) * 15 * deg,
	}
}

func randomMask(rng *rand.Rand) []survey.HorizonPoint {
	switch rng.IntN(3) {
	case 0:
		return nil
	case 1:
		return []survey.HorizonPoint{{Azimuth: 0, Altitude: 12 * deg}, {Azimuth: 90 * deg, Altitude: 20 * deg}, {Azimuth: 180 * deg, Altitude: 10 * deg}, {Azimuth: 270 * deg, Altitude: 45 * deg}}
	}
	var out []survey.HorizonPoint
	for az := rng.Float64() * 30; az < 360; az += 1 + rng.Float64()*60 {
		out = append(out, survey.HorizonPoint{Azimuth: az * deg, Altitude: rng.Float64() * 70 * deg})
	}
	return out
}

// randomSurvey draws a small survey over odd places, two nights of any season.
func randomSurvey(seed uint64, fields int) *survey.Survey {
	rng := rand.New(rand.NewPCG(seed, 77))
	sv := makeSurvey(2, 2, fields, seed)
	sv.FirstNight += survey.Day(rng.IntN(365))
	sv.LastNight = sv.FirstNight + 1
	for i := range sv.Sites {
		s := pick(rng, append(oddPlaces, places...)...)
		s.Telescopes = []int{i}
		s.Horizon = randomMask(rng)
		sv.Sites[i] = s
		randomMount(rng, &sv.Telescopes[i])
	}
	for i := range sv.Fields {
		f := &sv.Fields[i]
		f.Dec = math.Asin(2*rng.Float64() - 1)
		if rng.IntN(6) == 0 {
			f.Dec = pick(rng, 90*deg, -90*deg, 89.95*deg, sv.Sites[0].Latitude)
		}
		if rng.IntN(6) == 0 {
			f.PMRA, f.PMDec = 3*arcsec, -10*arcsec
		}
		if rng.IntN(6) == 0 {
			f.NotBefore = sv.FirstNight.Unix() + rng.Float64()*86400
		}
		if rng.IntN(6) == 0 {
			f.NotAfter = sv.LastNight.Unix() + rng.Float64()*86400
		}
		f.Rules = []survey.Rules{randomRules(rng), randomRules(rng)}
	}
	return sv
}

// judge looks at one field over one site by the exact path.
type judge struct {
	b                  *built
	field, demand, tel int
	place              visibility.Site
	position           visibility.Position
	telescope          *survey.Telescope
}

func (j *judge) sight(n *visibility.Instant) Sight { return SightAt(n, j.place, j.position) }

func (j *judge) reasons(s *Sight) Reasons {
	return Evaluate(j.b.sv, j.field, j.demand, j.tel, s)
}

// continues tells whether an exposure may run from one sight to the next,
// shortly after, as far as wraps and the lower meridian go.
func (j *judge) continues(a, b *Sight) bool {
	switch {
	case j.telescope.Mount == survey.Equatorial:
		return !PassesLowerMeridian(a.HourAngle, b.HourAngle)
	case j.telescope.AzimuthRange != nil:
		return !LeavesAzimuthRange(*j.telescope.AzimuthRange, a.Azimuth, b.Azimuth)
	}
	return true
}

// mayRun is continues, with the flip's rule too.
func (j *judge) mayRun(a, b *Sight) bool {
	return j.continues(a, b) && (j.telescope.Flip == nil || !CrossesMeridian(j.telescope.Flip, a.HourAngle, b.HourAngle))
}

func TestEveryInstantOfAWindowIsLegal(t *testing.T) {
	inside, edges, flips, odd, cells := 0, 0, 0, 0, 0
	for seed := range uint64(40) {
		sv := randomSurvey(seed, 24)
		b := build(t, sv, 1)
		for i := range b.win.nights {
			odd += len(b.win.nights[i].odd)
		}
		positions := Positions(sv)
		for f := range sv.Fields {
			for d := range sv.Fields[f].Rules {
				for tel := range sv.Telescopes {
					j := &judge{b, f, d, tel, Place(&sv.Sites[sv.Telescopes[tel].Site]), positions[f], &sv.Telescopes[tel]}
					for n := range sv.Nights() {
						cells++
						for _, w := range b.win.Of(b.win.Unit(f, d), b.win.Class(tel), n) {
							if msg := j.check(w, &inside, &edges, &flips); msg != "" {
								t.Errorf("seed %d field %d demand %d telescope %d night %d window %v: %s", seed, f, d, tel, n, w, msg)
							}
						}
					}
				}
			}
		}
	}
	t.Logf("%d instants inside and %d edges checked, %d windows over a flip; %d odd cells of %d", inside, edges, flips, odd, cells)
	if inside < 5000 || edges < 1000 || flips == 0 {
		t.Error("too little was checked for the test to mean anything")
	}
}

// check steps through a window and returns what is wrong, or "".
func (j *judge) check(w Window, inside, edges, flips *int) string {
	iv := j.b.win.Interval(w)
	var prev Sight
	first, last := 0.0, 0.0
	for t := iv.From; ; t = math.Min(t+173, iv.To) {
		s := j.sight(j.b.e.At(t))
		if why := j.reasons(&s); why != 0 {
			return fmt.Sprintf("%s at %g s of %d: altitude %.6f azimuth %.6f hour angle %.6f moon %.6f lit %.6f sun %.6f", why, t-iv.From, w.To-w.From,
				s.Altitude/deg, s.Azimuth/deg, s.HourAngle/deg, s.MoonSeparation/deg, s.MoonIllumination, s.SunAltitude/deg)
		}
		if t == iv.From {
			first = s.HourAngle
			*edges += 2
		} else if !j.continues(&prev, &s) {
			return fmt.Sprintf("track from azimuth %.6f hour angle %.6f to %.6f, %.6f", prev.Azimuth/deg, prev.HourAngle/deg, s.Azimuth/deg, s.HourAngle/deg)
		}
		*inside++
		prev, last = s, s.HourAngle
		if t >= iv.To {
			break
		}
	}
	if f := j.telescope.Flip; f != nil {
		if CrossesMeridian(f, first, last) {
			return fmt.Sprintf("from hour angle %.6f to %.6f past the meridian", first/deg, last/deg)
		}
		if first < 0 && last > 0 {
			*flips++
		}
	}
	return ""
}

func TestOuterWindowsHoldEveryLegalStretch(t *testing.T) {
	const step = 97.0
	legal := 0
	for seed := range uint64(24) {
		sv := randomSurvey(1000+seed, 12)
		b := build(t, sv, 1)
		positions := Positions(sv)
		for tel := range sv.Telescopes {
			site := sv.Telescopes[tel].Site
			for n := range sv.Nights() {
				night := b.cal.Night(site, n)
				outerOf := make([][]Window, len(sv.Fields)*2)
				prev := make([]Sight, len(sv.Fields)*2)
				was := make([]bool, len(sv.Fields)*2)
				for k := range outerOf {
					outerOf[k] = b.win.AppendOuter(nil, b.win.Unit(k/2, k%2), b.win.Class(tel), n)
				}
				for at := night.From + 1; at < night.To; at += step {
					instant := b.e.At(at)
					for k := range outerOf {
						j := &judge{b, k / 2, k % 2, tel, Place(&sv.Sites[site]), positions[k/2], &sv.Telescopes[tel]}
						s := j.sight(instant)
						ok := j.reasons(&s) == 0
						if ok {
							legal++
							if !inOne(b.win, outerOf[k], at, at) || was[k] && j.mayRun(&prev[k], &s) && !inOne(b.win, outerOf[k], prev[k].Unix, at) && j.fine(prev[k].Unix, at) {
								t.Errorf("seed %d field %d demand %d telescope %d night %d: legal from %.1f to %.1f, outer %v", seed, k/2, k%2, tel, n,
									prev[k].Unix-float64(b.win.Epoch()), at-float64(b.win.Epoch()), outerOf[k])
							}
						}
						prev[k], was[k] = s, ok
					}
				}
			}
		}
	}
	t.Logf("%d legal instants", legal)
	if legal < 5000 {
		t.Error("too few legal instants for the test to mean anything")
	}
}

// fine tells whether the stretch between two legal instants is legal at every
// 0.1 s too, and its track unbroken: a peak of the mask may bar a second, and
// next to the zenith azimuth turns by more than half a turn in a step.
func (j *judge) fine(from, to float64) bool {
	prev := j.sight(j.b.e.At(from))
	for t := from; t < to; t = math.Min(t+0.1, to) {
		s := j.sight(j.b.e.At(t))
		if j.reasons(&s) != 0 || !j.mayRun(&prev, &s) {
			return false
		}
		prev = s
	}
	return true
}

func inOne(w *Windows, ws []Window, from, to float64) bool {
	for _, x := range ws {
		if iv := w.Interval(x); iv.From <= from && to <= iv.To {
			return true
		}
	}
	return false
}
