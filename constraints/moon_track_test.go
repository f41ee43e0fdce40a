package constraints

import (
	"math"
	"testing"

	"nightwright/visibility"
)

// The certificates of windows lean on bounds of the Moon's and Sun's motion.
// Here they are held against a year of the exact path, from places where
// parallax is large (the equator) and none (a pole): differences over 600 s.
func TestMotionKeepsItsBounds(t *testing.T) {
	e := newExact()
	const h = 600.0
	var speed, bend, altBend, sunBend, litBend float64
	for _, s := range []visibility.Site{{}, {Latitude: 90 * deg}, {Latitude: -35 * deg, Longitude: 2}} {
		sky := visibility.NewSky(e, []visibility.Site{s}, nil, nil, 1.8e9, 1.8e9+366*86400, 2)
		for day := 0.0; day < 365; day += 0.31 {
			t0 := math.Floor((1.8e9+day*86400)/h) * h
			a, b, c := sky.Frame(0, t0), sky.Frame(0, t0+h), sky.Frame(0, t0+2*h)
			speed = max(speed, b.Moon.Sub(a.Moon).Norm()/h)
			bend = max(bend, a.Moon.Add(c.Moon).Sub(b.Moon.Scale(2)).Norm()/(h*h))
			altBend = max(altBend, math.Abs(a.SinMoon+c.SinMoon-2*b.SinMoon)/(h*h))
			sunBend = max(sunBend, math.Abs(a.SinSun+c.SinSun-2*b.SinSun)/(h*h))
			litBend = max(litBend, math.Abs(a.Illumination+c.Illumination-2*b.Illumination)/(h*h))
		}
	}
	for _, x := range []struct {
		name       string
		got, bound float64
	}{
		{"Moon's speed", speed, moonSpeed}, {"Moon's bend", bend, moonBend}, {"Moon's altitude", altBend, altitudeBend},
		{"Sun's altitude", sunBend, altitudeBend}, {"lit fraction", litBend, illuminationBend},
	} {
		t.Logf("%s: at most %.3g, bound %.3g", x.name, x.got, x.bound)
		if x.got > x.bound {
			t.Errorf("%s reaches %g, over its bound %g", x.name, x.got, x.bound)
		}
		if x.got < x.bound/20 {
			t.Errorf("%s reaches %g only: is it measured?", x.name, x.got)
		}
	}
}

// Between the knots the track follows the exact path.
func TestTrackFollowsTheMoon(t *testing.T) {
	e := newExact()
	s := visibility.Site{Latitude: 10 * deg, Longitude: -1}
	sky := visibility.NewSky(e, []visibility.Site{s}, nil, nil, 1.8e9, 1.8e9+20*86400, 1)
	worst, worstLit, worstSun := 0.0, 0.0, 0.0
	for day := 1.0; day < 19; day++ {
		from := 1.8e9 + day*86400
		track := newBodyTrack(sky, 0, from, from+40000)
		for at := from; at < from+40000; at += 777 {
			fr := sky.Frame(0, at)
			moon, sun := e.Moon(s, at), e.Sun(s, at)
			m := track.moonAt(at)
			d := moon.Direction
			exact := fr.East.Scale(d[0]).Add(fr.North.Scale(d[1])).Add(fr.Zenith.Scale(d[2]))
			worst = max(worst, m.Sub(exact).Norm())
			worstSun = max(worstSun, math.Abs(fr.Zenith.Dot(track.sunAt(at))-sun.Direction[2]))
			worstLit = max(worstLit, math.Abs(track.litAt(at)-moon.Illumination))
		}
	}
	t.Logf("Moon %.4f arcsec, Sun %.4f arcsec, lit fraction %.2g", worst/arcsec, worstSun/arcsec, worstLit)
	if worst > 0.05*arcsec || worstSun > 0.05*arcsec || worstLit > illuminationGuard/2 {
		t.Errorf("the track is off by %.4f arcsec (Moon), %.4f (Sun), %.2g (lit)", worst/arcsec, worstSun/arcsec, worstLit)
	}
}
