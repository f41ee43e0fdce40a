package draw

import (
	"fmt"
	"math"

	"nightwright/visibility"
)

// CalendarNight is one night of a site.
type CalendarNight struct {
	Label        string  // the date of its evening
	Midnight     float64 // the middle of the night's label at the site, UTC Unix s
	Set          []visibility.Interval
	Nautical     []visibility.Interval // Sun under -12 deg
	Dark         []visibility.Interval // Sun under -18 deg
	Moon         []visibility.Interval // Moon up
	Illumination float64
}

// CalendarUse is one telescope's night.
type CalendarUse struct {
	Open, Used float64 // h
	Price      float64 // coverage per hour
	Visits     int
}

// CalendarSite is one site's nights with its telescopes'.
type CalendarSite struct {
	Name       string
	Nights     []CalendarNight
	Telescopes []string
	Use        [][]CalendarUse // by telescope and night
}

const (
	calLeft, calWidth = 118.0, 858.0
	calStrip          = 11.0
)

// Calendar draws each site's nights, side by side: when it is dark and the
// Moon is up, and, below, how far each telescope's night is used and what an
// hour of it is worth. days are the nights' dates, UTC Unix s.
func Calendar(name, title string, sites []CalendarSite, days []float64) *Canvas {
	c := New(name, title, 1000, 100)
	dear := 0.0
	for _, s := range sites {
		for _, tel := range s.Use {
			for _, u := range tel {
				dear = max(dear, u.Price)
			}
		}
	}
	y := c.legend(20, 18, 960, []Key{
		{Style{Fill: Day}, "Sun up", false}, {Style{Fill: Dusk}, "Sun 0 to -12°", false}, {Style{Fill: Gloom}, "-12 to -18°", false},
		{Style{Fill: Dark}, "dark", false}, {Style{Fill: Moon, Opacity: 0.75}, "Moon up, the stronger the fuller", false},
	})
	y = c.rampKey(20, y+8, "used, of open time", "0", "100 %")
	c.rampKey(330, y-18, "price of an hour", "0", Number(dear*1e6, 0)+" millionths of coverage")
	c.Rect(760, y-18, 14, 11, Style{Stroke: Axis, Width: 1})
	c.Text(780, y-8, "not open", Type{Ink: Soft})
	x := scale{0, float64(len(days)), calLeft, calLeft + calWidth}
	dearest, dearestAt := 0.0, ""
	for _, s := range sites {
		y = c.calendarSite(s, x, y+14, dear)
		for t, tel := range s.Use {
			for n, u := range tel {
				if u.Price > dearest {
					dearest, dearestAt = u.Price, s.Telescopes[t]+" on "+s.Nights[n].Label
				}
			}
		}
	}
	if len(days) > 0 {
		at, text := dates(days[0], days[len(days)-1]+86400, 14)
		for k, t := range at {
			if n := (t - days[0]) / 86400; n < float64(len(days)) {
				c.Text(min(max(x.px(n+0.5), calLeft+22), calLeft+calWidth-18), y+10, text[k], Type{Size: 11, Ink: Soft, Anchor: Middle})
			}
		}
	}
	c.Grow(y + 22)
	c.Alt = fmt.Sprintf("Calendar of %d nights at %d sites: darkness, moonlight, how far nights are used, and what an hour is worth.", len(days), len(sites))
	if dearestAt != "" {
		c.Alt += fmt.Sprintf(" The dearest hours are those of %s.", dearestAt)
	}
	return c
}

// rampKey writes a legend of a ramp and returns the y below it.
func (c *Canvas) rampKey(x, y float64, text, low, high string) float64 {
	c.Text(x, y+10, text, Type{Ink: Soft})
	at := x + textWidth(text, 12) + 12
	c.Text(at, y+10, low, Type{Size: 11, Ink: Soft})
	at += textWidth(low, 11) + 5
	for k := range RampSteps {
		c.Rect(at+float64(k)*14, y, 14, 11, Style{Fill: Ramp0 + Ink(k)})
	}
	c.Text(at+14*RampSteps+6, y+10, high, Type{Size: 11, Ink: Soft})
	return y + 18
}

func (c *Canvas) calendarSite(s CalendarSite, x scale, y, dear float64) float64 {
	const tall = 78.0
	half := 0.0 // h from midnight that must be in sight
	for _, n := range s.Nights {
		for _, iv := range n.Set {
			half = max(half, math.Abs(iv.From-n.Midnight)/3600, math.Abs(iv.To-n.Midnight)/3600)
		}
	}
	half = min(max(half+0.3, 4), 12)
	c.Text(20, y+12, Clip(s.Name, 40), Type{Size: 13, Bold: true})
	c.Text(calLeft+calWidth, y+12, "hours of local mean time", Type{Size: 10, Ink: Soft, Anchor: End})
	y += 20
	v := scale{-half, half, y, y + tall}
	c.Rect(x.at, y, x.end-x.at, tall, Style{Fill: Day})
	layer := func(style Style, of func(n *CalendarNight) []visibility.Interval) {
		for k := range s.Nights {
			n := &s.Nights[k]
			for _, iv := range of(n) {
				from, to := max((iv.From-n.Midnight)/3600, -half), min((iv.To-n.Midnight)/3600, half)
				c.Rect(x.px(float64(k)), v.px(from), x.px(float64(k+1))-x.px(float64(k)), v.px(to)-v.px(from), style)
			}
		}
	}
	layer(Style{Fill: Dusk}, func(n *CalendarNight) []visibility.Interval { return n.Set })
	layer(Style{Fill: Gloom}, func(n *CalendarNight) []visibility.Interval { return n.Nautical })
	layer(Style{Fill: Dark}, func(n *CalendarNight) []visibility.Interval { return n.Dark })
	for step := 1; step <= 5; step++ { // few steps, so that nights share a path
		layer(Style{Fill: Moon, Opacity: 0.14 * float64(step)}, func(n *CalendarNight) []visibility.Interval {
			if int(math.Ceil(n.Illumination*5)) != step {
				return nil
			}
			return overlap(n.Moon, n.Set)
		})
	}
	for h := -9; h <= 9; h += 3 {
		if math.Abs(float64(h)) < half-0.4 {
			c.Text(calLeft-8, v.px(float64(h))+4, fmt.Sprintf("%d h", (h+24)%24), Type{Size: 10, Ink: Soft, Anchor: End})
		}
	}
	y += tall + 4
	for t, tel := range s.Telescopes {
		c.Text(calLeft-8, y+calStrip-2, Clip(tel, 11)+" used", Type{Size: 10, Ink: Soft, Anchor: End})
		c.strip(s, t, x, y, func(u CalendarUse) float64 { return u.Used / u.Open })
		y += calStrip + 1
		c.Text(calLeft-8, y+calStrip-2, "price", Type{Size: 10, Ink: Soft, Anchor: End})
		c.strip(s, t, x, y, func(u CalendarUse) float64 { return u.Price / dear })
		y += calStrip + 5
	}
	return y
}

// strip draws one value of a telescope's nights.
func (c *Canvas) strip(s CalendarSite, t int, x scale, y float64, of func(u CalendarUse) float64) {
	for k, u := range s.Use[t] {
		style := Style{Stroke: Axis, Width: 0.6}
		if u.Open > 0 {
			part := of(u)
			if math.IsNaN(part) {
				part = 0
			}
			style = Style{Fill: Ramp(part)}
		}
		c.Hint(fmt.Sprintf("%s, %s: %.1f of %.1f h used, %d visits, %.0f millionths an hour", s.Nights[k].Label, s.Telescopes[t], u.Used, u.Open, u.Visits, u.Price*1e6))
		c.Rect(x.px(float64(k)), y, max(x.px(float64(k+1))-x.px(float64(k))-0.4, 0.6), calStrip, style)
	}
}

// overlap is the time that lies in both lists.
func overlap(a, b []visibility.Interval) []visibility.Interval {
	var out []visibility.Interval
	for _, p := range a {
		for _, q := range b {
			if from, to := max(p.From, q.From), min(p.To, q.To); to > from {
				out = append(out, visibility.Interval{From: from, To: to})
			}
		}
	}
	return out
}
