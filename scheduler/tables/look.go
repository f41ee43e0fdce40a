package tables

import (
	"cmp"
	"context"
	"math"
	"slices"

	"nightwright/constraints"
	"nightwright/constraints/mount"
	"nightwright/constraints/survey"
	"nightwright/scheduler/model"
	"nightwright/visibility"
)

// look is what the exact path says about one exposure.
type look struct {
	star visibility.Horizontal // at the middle
	light
	start, end mount.Pointing
	gap        float64 // needed before it, s
}

// light is the sky at a field.
type light struct {
	airmass               float64
	sun, moon, separation float64 // altitudes, and the field from the Moon; rad
	sky, quality          float64
}

// sky asks the exact path about one field at one instant.
func sky(at *visibility.Instant, site visibility.Site, p visibility.Position, filter visibility.Filter) (visibility.Horizontal, light) {
	star, sun, moon := at.Star(site, p), at.Sun(site), at.Moon(site)
	l := light{
		airmass: visibility.Airmass(star.Direction[2]),
		sun:     sun.Altitude, moon: moon.Altitude, separation: visibility.Separation(star, moon.Horizontal),
	}
	g := visibility.Geometry{
		SinAltitude: star.Direction[2], SunAltitude: l.sun, MoonAltitude: l.moon,
		MoonSeparation: l.separation, MoonPhaseAngle: moon.PhaseAngle,
	}
	l.sky, l.quality = visibility.SkyMagnitude(filter, g), visibility.Quality(filter, g)
	return star, l
}

// lookChunk is how many exposures, neighbours in time, are one piece of work.
const lookChunk = 256

// look asks the exact path about every exposure.
func (b *builder) look(ctx context.Context) error {
	b.looks = make([]look, len(b.shots))
	chunks := (len(b.shots) + lookChunk - 1) / lookChunk
	model.Parallel(b.workers, chunks, func(c int) {
		if ctx.Err() != nil {
			return
		}
		for i := c * lookChunk; i < min((c+1)*lookChunk, len(b.shots)); i++ {
			b.lookAt(i)
		}
	})
	return errStopped(ctx)
}

func (b *builder) lookAt(i int) {
	s, l := &b.shots[i], &b.looks[i]
	site := b.sites[b.sv.Telescopes[s.Telescope].Site]
	half := float64(s.End-s.Start) / 2e6
	at := b.exact.At(float64(s.Start)/1e6 + half)
	l.star, l.light = sky(at, site, b.places[s.Field], b.sv.Filters[b.step(s).Filter])
	if s.State == model.Done {
		l.quality = s.Quality
	}
	l.start, l.end = spin(l.star, site, -half), spin(l.star, site, half)
}

// earthSpin is the rate of the Earth rotation angle, rad/s (IAU 2000
// Resolution B1.8: 1.00273781191135448 turns a day).
const earthSpin = 2 * math.Pi * 1.00273781191135448 / 86400

// spin turns a place by dt seconds of Earth rotation. What else moves a star
// in that time, aberration first, comes to 0.02" in an hour: a hundred
// thousandth of a second of any slew.
func spin(h visibility.Horizontal, site visibility.Site, dt float64) mount.Pointing {
	ha := h.HourAngle + earthSpin*dt
	if ha = math.Remainder(ha, 2*math.Pi); ha == -math.Pi {
		ha = math.Pi
	}
	sh, ch := math.Sincos(ha)
	sd, cd := math.Sincos(h.Declination)
	sl, cl := math.Sincos(site.Latitude)
	east, north, up := -cd*sh, cl*sd-sl*cd*ch, sl*sd+cl*cd*ch
	az := math.Atan2(east, north)
	if az < 0 {
		az += 2 * math.Pi
	}
	return mount.Pointing{Altitude: math.Atan2(up, math.Hypot(east, north)), Azimuth: az, HourAngle: ha, Declination: h.Declination}
}

// setGaps works out the gap that each exposure needs after the one before it
// on its telescope. The first of a night needs none, unless it is dark at the
// transit between: then the two nights are one sequence.
func (b *builder) setGaps() {
	order := make([]int32, len(b.shots))
	for i := range order {
		order[i] = int32(i)
	}
	slices.SortStableFunc(order, func(x, y int32) int {
		return cmp.Or(cmp.Compare(b.shots[x].Telescope, b.shots[y].Telescope), cmp.Compare(b.shots[x].Start, b.shots[y].Start))
	})
	for k := 1; k < len(order); k++ {
		i, j := order[k-1], order[k]
		p, s := &b.shots[i], &b.shots[j]
		if p.Telescope == s.Telescope && b.oneSequence(p, s) {
			from, to := &b.looks[i], &b.looks[j]
			b.looks[j].gap = mount.Gap(&b.sv.Telescopes[s.Telescope], from.end, to.start, b.step(p).Filter, b.step(s).Filter, mount.East(from.start), mount.East(to.start))
		}
	}
}

// oneSequence reports whether a slew leads from p to s.
func (b *builder) oneSequence(p, s *model.Exposure) bool {
	if p.Night == s.Night {
		return true
	}
	if s.Night != p.Night+1 || s.Night < 0 || int(s.Night) >= b.sv.Nights() {
		return false
	}
	return darkAtStart(b.sv, b.exact, b.cal.Night(b.sv.Telescopes[s.Telescope].Site, int(s.Night)), int(s.Telescope))
}

// darkAtStart reports whether the Sun is within a telescope's loosest limit
// at the transit with which a night starts.
func darkAtStart(sv *survey.Survey, e *visibility.Exact, night visibility.Interval, telescope int) bool {
	t := &sv.Telescopes[telescope]
	limit, ok := sv.LoosestSun(telescope)
	site := &sv.Sites[t.Site]
	return ok && e.Sun(constraints.Place(site), night.From).Altitude <= limit
}
