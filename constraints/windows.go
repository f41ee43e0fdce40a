package constraints

import (
	"context"
	"math"
	"slices"
	"sync"

	"nightwright/constraints/survey"
	"nightwright/visibility"
)

// Window is a stretch of whole seconds since the Windows' epoch, [From, To).
type Window struct{ From, To int32 }

// Windows holds when fields may be observed: for each unit (a field and a set
// of rules), class (a site and the limits of a mount) and night, the stretches
// in which every instant is legal by every rule but min_quality, the closures,
// losses and reserves of the calendar. An exposure is legal when it lies
// within one of the windows, and within open time.
//
// Windows are sorted by From. They are disjoint, save on a mount that flips:
// there the last part of a window before the meridian and the first of the one
// after it overlap, for an exposure may be started on either side.
//
// Edges are rounded inward to whole seconds from directions that are known to
// an arc second, so that no instant of a window breaks a rule on the exact
// path; Outer gives the same rounded outward, for bounds.
//
// Memory: 4 bytes a (unit, class, night) and 8 bytes a window. A Windows is
// immutable and safe for concurrent use.
type Windows struct {
	epoch    int64
	units    []unit
	classes  []class
	unitOf   []int32 // by fieldAt[field] + demand
	fieldAt  []int32
	classOf  []int32 // by telescope
	nights   []nightWindows
	sv       *survey.Survey
	calendar *Calendar
}

// nightWindows is one night's windows: those of unit u and class c are
// windows[at[c*units+u]:at[c*units+u+1]].
type nightWindows struct {
	at      []uint32
	windows []Window
	// The few cells whose outer windows are more than the inner ones widened.
	odd        []uint32 // cells, ascending
	oddAt      []uint32
	oddWindows []Window
}

// EdgeSlack is how far, in s, Outer widens a window on each side where nothing
// unusual happens: true edges lie no further out. Where a field grazes a limit
// the outer windows are stored instead.
const EdgeSlack = 2

// NewWindows works out the windows of a whole survey. The sky must cover the
// survey's Period with its fields and sites by id. The result doesn't depend
// on the number of workers. It errs only when ctx ends.
func NewWindows(ctx context.Context, sv *survey.Survey, sky *visibility.Sky, cal *Calendar, workers int) (*Windows, error) {
	w := &Windows{epoch: Epoch(sv), sv: sv, calendar: cal, nights: make([]nightWindows, cal.Nights())}
	w.setClasses()
	w.setUnits()
	needed := w.needed()
	sites := make([]*sitePlan, len(sv.Sites))
	for i := range sites {
		sites[i] = newSitePlan(w, i, needed)
	}
	// Scratch space goes from night to night; nothing of it stays.
	pool := sync.Pool{New: func() any { return new(scratch) }}
	parallel(workers, cal.Nights(), func(n int) {
		if ctx.Err() != nil {
			return
		}
		mem := pool.Get().(*scratch)
		b := nightBuilder{w: w, needed: needed, sky: sky, cal: cal, night: n, scratch: mem}
		w.nights[n] = b.build(sites)
		pool.Put(mem)
	})
	if err := ctx.Err(); err != nil {
		return nil, err
	}
	return w, nil
}

// Epoch is the instant from which windows count, UTC Unix s.
func (w *Windows) Epoch() int64 { return w.epoch }

// Units returns the number of units.
func (w *Windows) Units() int { return len(w.units) }

// Classes returns the number of classes.
func (w *Windows) Classes() int { return len(w.classes) }

// Unit returns the unit of a field's demand.
func (w *Windows) Unit(field, demand int) int { return int(w.unitOf[int(w.fieldAt[field])+demand]) }

// Class returns the class of a telescope.
func (w *Windows) Class(telescope int) int { return int(w.classOf[telescope]) }

// Of returns the windows of a unit and class in a night (index from the
// first). There are none where no telescope of the class may serve the unit.
// The caller must not change them.
func (w *Windows) Of(unit, class, night int) []Window {
	n := &w.nights[night]
	k := class*len(w.units) + unit
	return n.windows[n.at[k]:n.at[k+1]]
}

// AppendOuter appends windows rounded outward: every legal exposure of the
// unit and class in that night lies within one of them. They may overlap.
func (w *Windows) AppendOuter(dst []Window, unit, class, night int) []Window {
	n := &w.nights[night]
	k := class*len(w.units) + unit
	if i, ok := slices.BinarySearch(n.odd, uint32(k)); ok {
		return append(dst, n.oddWindows[n.oddAt[i]:n.oddAt[i+1]]...)
	}
	for _, x := range n.windows[n.at[k]:n.at[k+1]] {
		dst = append(dst, Window{x.From - EdgeSlack, x.To + EdgeSlack})
	}
	return dst
}

// Interval turns a window into UTC Unix seconds.
func (w *Windows) Interval(x Window) visibility.Interval {
	return visibility.Interval{From: float64(w.epoch + int64(x.From)), To: float64(w.epoch + int64(x.To))}
}

// Bytes returns the memory that the windows take.
func (w *Windows) Bytes() int64 {
	var sum int64
	for i := range w.nights {
		n := &w.nights[i]
		sum += int64(4*(cap(n.at)+cap(n.odd)+cap(n.oddAt)) + 8*(cap(n.windows)+cap(n.oddWindows)))
	}
	return sum
}

// UsableHours returns how long, in h, a field's demand may be observed in the
// period: summed over sites, the time in which some telescope there that may
// serve it is open within a window. min_quality and keep_free are apart.
func (w *Windows) UsableHours(field, demand int) float64 {
	sv := w.sv
	f := &sv.Fields[field]
	d := &sv.Programs[f.Program].Demands[demand]
	u := w.Unit(field, demand)
	var usable, stretch, part []visibility.Interval
	var scopes []int
	sum := 0.0
	for s := range sv.Sites {
		scopes = scopes[:0]
		for _, t := range sv.Sites[s].Telescopes {
			if sv.Qualifies(f, d, t) {
				scopes = append(scopes, t)
			}
		}
		for n := range w.nights {
			usable = usable[:0]
			for _, t := range scopes {
				stretch = stretch[:0]
				for _, x := range w.Of(u, w.Class(t), n) {
					stretch = append(stretch, w.Interval(x))
				}
				part = intersect(part[:0], union(stretch), w.calendar.Open(t, n))
				usable = append(usable, part...)
			}
			if len(usable) > 0 {
				sum += seconds(union(usable))
			}
		}
	}
	return sum / 3600
}

// class is a site and the limits of a mount there.
type class struct {
	site           int
	kind           survey.MountKind
	altMin, altMax float64
	azimuth        survey.AzimuthRange
	hasAzimuth     bool
	flip           survey.Flip // Time is 0: it doesn't bear on windows
	hasFlip        bool
}

func classOf(t *survey.Telescope) class {
	c := class{site: t.Site, kind: t.Mount, altMin: t.AltitudeMin, altMax: t.AltitudeMax}
	if t.Mount == survey.Altazimuth && t.AzimuthRange != nil {
		c.azimuth, c.hasAzimuth = *t.AzimuthRange, true
	}
	if t.Mount == survey.Equatorial && t.Flip != nil {
		c.flip.PastMeridian, c.hasFlip = t.Flip.PastMeridian, true
	}
	return c
}

func (w *Windows) setClasses() {
	w.classOf = make([]int32, len(w.sv.Telescopes))
	for i := range w.sv.Telescopes {
		c := classOf(&w.sv.Telescopes[i])
		k := slices.Index(w.classes, c)
		if k < 0 {
			k = len(w.classes)
			w.classes = append(w.classes, c)
		}
		w.classOf[i] = int32(k)
	}
}

// unit is a field with one set of rules, as far as windows go.
type unit struct {
	field int32
	rules survey.Rules // MinQuality is 0

	// The stricter of altitude_min and airmass_max, rad, and the sines of
	// limits moved inward [0] and outward [1].
	altMin            float64
	sinMin            [2]float64
	cosSep            [2]float64 // greatest cosine of the separation from the Moon
	hourMax           float64
	noMoonSep, noIllu bool
}

func (w *Windows) setUnits() {
	w.fieldAt = make([]int32, len(w.sv.Fields))
	airmass := make(map[float64]float64) // limit to altitude
	for i := range w.sv.Fields {
		f := &w.sv.Fields[i]
		w.fieldAt[i] = int32(len(w.unitOf))
		first := len(w.units)
		for j := range f.Rules {
			r := f.Rules[j]
			r.MinQuality = 0
			k := first
			for k < len(w.units) && w.units[k].rules != r {
				k++
			}
			if k == len(w.units) {
				if _, ok := airmass[r.AirmassMax]; !ok {
					airmass[r.AirmassMax] = AltitudeOfAirmass(r.AirmassMax)
				}
				w.units = append(w.units, newUnit(i, r, airmass[r.AirmassMax]))
			}
			w.unitOf = append(w.unitOf, int32(k))
		}
	}
}

func newUnit(field int, r survey.Rules, altAirmass float64) unit {
	u := unit{field: int32(field), rules: r, altMin: math.Max(r.AltitudeMin, altAirmass), hourMax: r.HourAngleMax}
	for side, sign := range sides {
		u.sinMin[side] = sinAbove(u.altMin + sign*directionGuard)
		u.cosSep[side] = math.Cos(math.Min(math.Pi, math.Max(0, r.MoonSeparationMin+sign*moonGuard)))
	}
	u.noMoonSep = !(r.MoonSeparationMin > 0)
	u.noIllu = r.MoonIlluminationMax >= 1
	return u
}

// sinAbove is the sine of an altitude limit; above the zenith nothing is legal.
func sinAbove(alt float64) float64 {
	switch {
	case alt > math.Pi/2:
		return 2
	case alt < -math.Pi/2:
		return -2
	}
	return math.Sin(alt)
}

// needed tells, by class*units+unit, whether some telescope of the class may
// serve some demand of the unit.
func (w *Windows) needed() []bool {
	out := make([]bool, len(w.classes)*len(w.units))
	for i := range w.sv.Fields {
		f := &w.sv.Fields[i]
		demands := w.sv.Programs[f.Program].Demands
		for j := range demands {
			u := w.Unit(i, j)
			for t := range w.sv.Telescopes {
				k := w.Class(t)*len(w.units) + u
				if !out[k] && w.sv.Qualifies(f, &demands[j], t) {
					out[k] = true
				}
			}
		}
	}
	return out
}
