package visibility

import (
	"math"
	"sync/atomic"

	"nightwright/visibility/ephemeris"
)

// The slow part of the sky (the matrix to the intermediate frame, the Earth's
// velocity, the geocentric Sun and Moon) costs tens of microseconds to
// evaluate and moves by less than a degree an hour. Each TT day therefore has
// one polynomial of degree 6 through 7 nodes 4 h apart. Against direct
// evaluation it is off by less than 1e-10 rad (TestDayTable); it depends on
// the day alone, so that results don't depend on what was asked before.

const (
	dayNodes  = 7
	nodeParts = dayNodes - 1 // node intervals a day
	quantity  = 18           // 9 of the matrix, 3 each of velocity, Sun and Moon
)

// dayTable holds, for one TT day, every quantity's values at the nodes.
type dayTable [dayNodes][quantity]float64

// slow is the slow part at one instant, GCRS axes.
type slow struct {
	matrix   ephemeris.Mat // to the intermediate frame
	velocity ephemeris.Vec // of the Earth, barycentric, units of c
	sun      ephemeris.Vec // geometric geocentric, au
	moon     ephemeris.Vec // geometric geocentric, km
}

// slowAt evaluates the slow part directly, t in TT centuries since J2000.0.
func slowAt(t float64) slow {
	return slow{
		matrix:   ephemeris.CelestialToIntermediate(t),
		velocity: ephemeris.EarthVelocity(t),
		sun:      ephemeris.SunGeocentric(t),
		moon:     ephemeris.MoonGeocentric(t),
	}
}

// newDayTable evaluates the nodes of a day, counted in TT days from J2000.0.
func newDayTable(day int) *dayTable {
	var d dayTable
	for k := range d {
		s := slowAt((float64(day) + float64(k)/nodeParts) / 36525)
		row := &d[k]
		for i := range 3 {
			copy(row[3*i:], s.matrix[i][:])
		}
		copy(row[9:], s.velocity[:])
		copy(row[12:], s.sun[:])
		copy(row[15:], s.moon[:])
	}
	return &d
}

// weights are Lagrange's for a fraction x of the day, a little outside it too.
func weights(x float64) (w [dayNodes]float64) {
	// 1 / prod(k-j) over j != k, for nodes 0..6.
	inverse := [dayNodes]float64{1. / 720, -1. / 120, 1. / 48, -1. / 36, 1. / 48, -1. / 120, 1. / 720}
	u := x * nodeParts
	var before, after [dayNodes]float64 // products of (u-j) over j < k, j > k
	before[0], after[dayNodes-1] = 1, 1
	for k := 1; k < dayNodes; k++ {
		before[k] = before[k-1] * (u - float64(k-1))
		after[dayNodes-1-k] = after[dayNodes-k] * (u - float64(dayNodes-k))
	}
	for k := range w {
		w[k] = before[k] * after[k] * inverse[k]
	}
	return w
}

// at interpolates everything at a fraction of the day.
func (d *dayTable) at(x float64) (s slow) {
	w := weights(x)
	var v [quantity]float64
	for k := range w {
		row := &d[k]
		for i := range v {
			v[i] += w[k] * row[i]
		}
	}
	for i := range 3 {
		copy(s.matrix[i][:], v[3*i:])
	}
	copy(s.velocity[:], v[9:])
	copy(s.sun[:], v[12:])
	copy(s.moon[:], v[15:])
	return s
}

// moonAt interpolates the Moon alone.
func (d *dayTable) moonAt(x float64) (m ephemeris.Vec) {
	w := weights(x)
	for k := range w {
		for i := range m {
			m[i] += w[k] * d[k][15+i]
		}
	}
	return m
}

// dayCache keeps day tables for 1899 to 2200, in pages made when first
// needed: 1 kB a day used. It is lock-free; two callers who race for a day
// compute the same table.
type dayCache struct {
	pages [cachePages]atomic.Pointer[cachePage]
}

const (
	cachePageDays = 512
	cachePages    = 216
	cacheFirst    = -37000 // TT days from J2000.0
)

type cachePage [cachePageDays]atomic.Pointer[dayTable]

// table returns the table of the TT day and the fraction of it at t, TT
// centuries since J2000.0.
func (c *dayCache) table(t float64) (*dayTable, float64) {
	days := t * 36525
	whole := math.Floor(days)
	day := int(whole)
	i := day - cacheFirst
	if i < 0 || i >= cachePages*cachePageDays {
		return newDayTable(day), days - whole
	}
	page := c.pages[i/cachePageDays].Load()
	if page == nil {
		c.pages[i/cachePageDays].CompareAndSwap(nil, new(cachePage))
		page = c.pages[i/cachePageDays].Load()
	}
	slot := &page[i%cachePageDays]
	d := slot.Load()
	if d == nil {
		slot.CompareAndSwap(nil, newDayTable(day))
		d = slot.Load()
	}
	return d, days - whole
}
