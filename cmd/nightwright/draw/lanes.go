package draw

import (
	"fmt"
	"math"
	"time"

	"nightwright/visibility"
)

// Block is an exposure in a lane.
type Block struct {
	From, To float64 // UTC, Unix s
	Kind     int     // series, such as the program
	Curve    int     // index of its field's curve
	Hint     string
}

// Curve is an altitude over time.
type Curve struct {
	T        []float64 // UTC, Unix s
	Altitude []float64 // rad
}

// at interpolates a curve.
func (c *Curve) at(t float64) float64 {
	n := len(c.T)
	for k := 1; k < n; k++ {
		if t <= c.T[k] {
			p := (t - c.T[k-1]) / (c.T[k] - c.T[k-1])
			return c.Altitude[k-1] + p*(c.Altitude[k]-c.Altitude[k-1])
		}
	}
	return c.Altitude[n-1]
}

// Lane is one telescope's night.
type Lane struct {
	Title    string
	Span     visibility.Interval   // what is shown
	Set      []visibility.Interval // Sun down
	Nautical []visibility.Interval
	Dark     []visibility.Interval
	Open     []visibility.Interval // when the telescope may observe
	Curves   []Curve               // of the fields that are observed
	Moon     Curve
	Blocks   []Block
	Note     string
}

// Lanes draws one night: for each telescope the altitudes of its fields,
// strong while they are observed, and the exposures in a lane below.
func Lanes(name, title string, kinds []string, lanes []Lane) *Canvas {
	c := New(name, title, 1000, 60)
	var keys []Key
	for k, kind := range kinds {
		keys = append(keys, Key{Style{Fill: Series(k)}, Clip(kind, 24), false})
	}
	keys = append(keys, Key{Style{Stroke: Moon, Width: 2.5, Dash: "7 4"}, "Moon", true},
		Key{Style{Fill: Dusk}, "Sun 0 to -12°", false}, Key{Style{Fill: Gloom}, "-12 to -18°", false},
		Key{Style{Stroke: Axis, Width: 1}, "open time", false})
	y := c.legend(20, 18, 960, keys)
	blocks := 0
	for i := range lanes {
		y = c.lane(&lanes[i], y+8)
		blocks += len(lanes[i].Blocks)
	}
	c.Grow(y)
	c.Alt = fmt.Sprintf("One night at %d telescopes: %d exposures in lanes, with the altitudes of their fields and of the Moon.", len(lanes), blocks)
	return c
}

func (c *Canvas) lane(l *Lane, y float64) float64 {
	const tall, thickness = 150.0, 20.0
	x := scale{l.Span.From, l.Span.To, 60, 975}
	c.Text(20, y+12, l.Title, Type{Size: 13, Bold: true})
	c.Text(975, y+12, l.Note, Type{Size: 11, Ink: Soft, Anchor: End})
	y += 22
	s := scale{0, math.Pi / 2, y + tall, y}
	c.Rect(60, y, 915, tall, Style{Fill: Day})
	shade := func(style Style, in []visibility.Interval) {
		for _, iv := range in {
			from, to := max(iv.From, l.Span.From), min(iv.To, l.Span.To)
			c.Rect(x.px(from), y, x.px(to)-x.px(from), tall, style)
		}
	}
	shade(Style{Fill: Dusk}, l.Set)
	shade(Style{Fill: Gloom}, l.Nautical)
	shade(Style{Fill: Panel}, l.Dark)
	for deg := 0; deg <= 90; deg += 30 {
		at := s.px(float64(deg) * math.Pi / 180)
		c.Line(Style{Stroke: Grid, Width: 1}, Point{60, at}, Point{975, at})
		c.Text(54, at+4, Number(float64(deg), 0)+"°", Type{Size: 10, Ink: Soft, Anchor: End})
	}
	for k := range l.Curves {
		c.altitude(&l.Curves[k], x, s, l.Span.From, l.Span.To, Style{Stroke: Axis, Width: 0.7, Opacity: 0.45})
	}
	c.altitude(&l.Moon, x, s, l.Span.From, l.Span.To, Style{Stroke: Moon, Width: 2.5, Dash: "7 4"})
	for _, b := range l.Blocks {
		c.altitude(&l.Curves[b.Curve], x, s, b.From, b.To, Style{Stroke: Series(b.Kind), Width: 4})
	}
	y += tall + 5
	for _, iv := range l.Open {
		c.Rect(x.px(iv.From), y, x.px(iv.To)-x.px(iv.From), thickness, Style{Stroke: Axis, Width: 1})
	}
	for _, b := range l.Blocks {
		c.Hint(b.Hint)
		c.Rect(x.px(b.From), y+2, max(x.px(b.To)-x.px(b.From)-0.5, 1), thickness-4, Style{Fill: Series(b.Kind)})
	}
	y += thickness
	first := math.Ceil(l.Span.From/3600) * 3600
	for t := first; t <= l.Span.To; t += 3600 {
		c.Line(Style{Stroke: Axis, Width: 1}, Point{x.px(t), y}, Point{x.px(t), y + 4})
		c.Text(x.px(t), y+16, time.Unix(int64(t), 0).UTC().Format("15:04"), Type{Size: 10, Ink: Soft, Anchor: Middle})
	}
	c.Text(54, y+16, "UTC", Type{Size: 10, Ink: Soft, Anchor: End})
	return y + 26
}

// altitude draws the part of a curve that is above the horizon.
func (c *Canvas) altitude(v *Curve, x, s scale, from, to float64, style Style) {
	var part []Point
	flush := func() {
		c.Line(style, part...)
		part = nil
	}
	put := func(t, alt float64) {
		if alt < 0 {
			flush()
			return
		}
		part = append(part, Point{x.px(t), s.px(alt)})
	}
	if len(v.T) == 0 {
		return
	}
	put(from, v.at(from))
	for k, t := range v.T {
		if t > from && t < to {
			put(t, v.Altitude[k])
		}
	}
	put(to, v.at(to))
	flush()
}
