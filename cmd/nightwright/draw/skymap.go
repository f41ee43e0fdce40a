package draw

import (
	"fmt"
	"math"
)

// SkyField is a field as the map of the sky shows it.
type SkyField struct {
	RA, Dec float64 // ICRS, rad
	Radius  float64 // of the circle that is drawn, rad
	Value   float64 // 0 to 1
	Nothing bool    // it gets no visit at all
	Hint    string  // shown under the pointer; "" for none
}

// SkyMap draws how much of each field is got on an equal-area map of the
// whole sky, with the ecliptic and the galactic plane.
func SkyMap(name, title string, fields []SkyField) *Canvas {
	c := New(name, title, 1000, 560)
	f := skyFrame{505, 252, 232}
	c.skyGround(f)
	classes := make([][]*SkyField, RampSteps+1) // the last: nothing
	for i := range fields {
		k := int(Ramp(fields[i].Value) - Ramp0)
		if fields[i].Nothing {
			k = RampSteps
		}
		classes[k] = append(classes[k], &fields[i])
	}
	for k, class := range classes {
		style := Style{Fill: Ramp0 + Ink(k), Stroke: max(Ramp3, Ramp0+Ink(k)), Width: 0.6} // pale ones need an edge
		if k == RampSteps {
			style = Style{Stroke: Alarm, Width: 1.2}
		}
		for _, sf := range class {
			c.skyCircle(f, sf, style)
		}
	}
	c.skyLines(f)
	var keys []Key
	for k := range RampSteps {
		text := fmt.Sprintf("%d-%d %%", k*100/RampSteps, (k+1)*100/RampSteps)
		keys = append(keys, Key{Style{Fill: Ramp0 + Ink(k)}, text, false})
	}
	keys = append(keys, Key{Style{Stroke: Alarm, Width: 1.5}, fmt.Sprintf("no visit (%d)", len(classes[RampSteps])), false},
		Key{Style{Stroke: Text, Width: 1.3, Dash: "7 4"}, "ecliptic", true}, Key{Style{Stroke: Text, Width: 1.5, Dash: "0.1 4"}, "galactic plane", true})
	y := c.legend(60, 518, 900, keys)
	c.Text(60, y+12, "Equal-area map of the sky, ICRS; right ascension grows to the left. A field's shade is the part of its wanted visits that it gets, weighed by quality.", Type{Size: 11, Ink: Soft})
	low := 0
	for i := range fields {
		if fields[i].Value < 0.5 {
			low++
		}
	}
	c.Alt = fmt.Sprintf("Map of the whole sky with %d fields: %d get half of what they want or more, %d less, of which %d no visit at all.", len(fields), len(fields)-low, low, len(classes[RampSteps]))
	return c
}

func (c *Canvas) skyCircle(f skyFrame, sf *SkyField, style Style) {
	radius := max(sf.Radius, 1.6/(f.scale*math.Sqrt2)) // the map's area is half the sphere's, in units of scale
	px := radius * f.scale * math.Sqrt2
	n := min(max(8, int(2.6*px)), 48)
	for _, ring := range capOutlines(sf.RA, sf.Dec, radius, n) {
		c.Hint(sf.Hint)
		c.Polygon(f.points(ring), style)
	}
}
