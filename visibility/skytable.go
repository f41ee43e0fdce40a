package visibility

import "math"

// filterSky holds a filter's part of the quality formula as tables in the
// sine of the altitude, relative to the filter's dark zenith sky.
type filterSky struct {
	path      []pathRow // pathSteps+1 rows over sin h = 0..1
	moonScale float64   // nL of moonlight to units of the dark zenith sky
	k         float64
	filter    Filter
	darkFlux  float64 // 10^(-0.4 dark_sky)
	curve     *curvature
}

// pathRow is what depends on the field's altitude alone.
type pathRow struct {
	clear float64 // 10^(-0.8 k) X^-1.2, X of Young 1994
	dark  float64 // dark sky over its zenith value
	loss  float64 // 1 - 10^(-0.4 k X), X of KS91 eq. 3
}

// pathSteps cells make linear interpolation good to 2e-5 at sin h = 0.05 and
// 1e-7 above 0.3 (TestSkyQuality).
const pathSteps = 8192

// sinTwilightEnd is the sine of the Sun's altitude at which twilight ends: -16 deg.
var sinTwilightEnd = math.Sin(-16 * math.Pi / 180)

func newFilterSky(f Filter) filterSky {
	ft := filterSky{filter: f, k: f.Extinction, darkFlux: math.Pow(10, -0.4*f.DarkSky)}
	ft.path = make([]pathRow, pathSteps+1)
	for i := range ft.path {
		s := float64(i) / pathSteps
		x := Airmass(s)
		ks := scatterPath(s)
		ft.path[i] = pathRow{
			clear: math.Pow(10, -0.8*f.Extinction*(x-1)) * math.Pow(x, -1.2),
			dark:  darkSkyFactor(f.Extinction, s),
			loss:  1 - math.Pow(10, -0.4*f.Extinction*ks),
		}
	}
	// One nanolambert as flux, over the dark zenith flux, in the filter.
	ft.moonScale = f.Moonlight * nanolambertFlux / ft.darkFlux
	ft.curve = newCurvature(&ft)
	return ft
}

// moonPath is the moonlight's own extinction, KS91 eq. 15.
func (ft *filterSky) moonPath(sinMoon float64) float64 {
	return math.Pow(10, -0.4*ft.k*scatterPath(sinMoon))
}

// twilight is the twilight's light over the dark zenith sky.
func (ft *filterSky) twilight(sinSun float64) float64 {
	return twilightFlux(ft.filter.Band, math.Asin(sinSun)) / ft.darkFlux
}

// scatterTable holds KS91's scattering function f(rho) in the cosine of the
// separation, -1 to cos 10 deg; nearer the Moon it is evaluated directly.
var scatterTable = func() (t [scatterSteps + 1]float64) {
	for i := range t {
		c := -1 + float64(i)*(cosNearMoon+1)/scatterSteps
		t[i] = scatterFunction(math.Acos(math.Max(-1, c)))
	}
	// The last entry is the far branch's limit at 10 deg.
	t[scatterSteps] = scatterFunction(10 * math.Pi / 180)
	return t
}()

const scatterSteps = 8192

var cosNearMoon = math.Cos(10 * math.Pi / 180)

// scattering returns f(rho) for cos rho, good to 1e-6.
func scattering(cos float64) float64 {
	if cos > cosNearMoon {
		return scatterFunction(math.Acos(math.Min(1, cos)))
	}
	x := (cos + 1) * (scatterSteps / (cosNearMoon + 1))
	if !(x > 0) {
		return scatterTable[0]
	}
	k := int(x)
	if k >= scatterSteps {
		k = scatterSteps - 1
	}
	return scatterTable[k] + (x-float64(k))*(scatterTable[k+1]-scatterTable[k])
}
