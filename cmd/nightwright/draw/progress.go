package draw

import "fmt"

// Mark is a value at an instant (UTC, Unix s).
type Mark struct{ T, Value float64 }

// Band is a range of values over time.
type Band struct {
	Text      string
	T         []float64
	Low, High []float64
	Middle    []float64
}

// Course is how coverage grows with time.
type Course struct {
	From, To float64 // UTC, Unix s
	Planned  []Mark  // cumulative, ascending
	Done     []Mark  // cumulative; nil without any
	Ceiling  float64 // nothing legal exceeds it
	Band     *Band   // of a forecast; nil without one
	Now      float64 // an instant to mark; 0: none
}

// Progress draws the coverage that is reached by each instant.
func Progress(name, title string, p Course) *Canvas {
	c := New(name, title, 1000, 350)
	keys := []Key{{Style{Stroke: Accent, Width: 3}, "plan, on clear nights", true}, {Style{Stroke: Text, Width: 1.5, Dash: "6 4"}, "ceiling", true}}
	if len(p.Done) > 0 {
		keys = append(keys, Key{Style{Stroke: Series2, Width: 3}, "done", true})
	}
	if p.Band != nil {
		keys = append(keys, Key{Style{Fill: Series4, Opacity: 0.35}, p.Band.Text, false})
	}
	y := c.legend(70, 18, 900, keys) + 20
	h := 310 - y
	most := max(p.Ceiling, 0.01)
	for _, m := range p.Planned {
		most = max(most, m.Value)
	}
	s := c.frame(70, y, 900, h, 0, min(top(most*1.04), 1.02), "")
	c.Text(70, y-10, "coverage", Type{Size: 12, Bold: true})
	x := scale{p.From, p.To, 70, 970}
	c.timeAxis(x, y, h, 12)
	if b := p.Band; b != nil && len(b.T) > 1 {
		area := make([]Point, 0, 2*len(b.T))
		for k := range b.T {
			area = append(area, Point{x.px(b.T[k]), s.px(b.High[k])})
		}
		for k := len(b.T) - 1; k >= 0; k-- {
			area = append(area, Point{x.px(b.T[k]), s.px(b.Low[k])})
		}
		c.Polygon(area, Style{Fill: Series4, Opacity: 0.35})
		var mid []Point
		for k := range b.Middle {
			mid = append(mid, Point{x.px(b.T[k]), s.px(b.Middle[k])})
		}
		c.Line(Style{Stroke: Series4, Width: 2}, mid...)
	}
	c.Line(Style{Stroke: Text, Width: 1.5, Dash: "6 4"}, Point{70, s.px(p.Ceiling)}, Point{970, s.px(p.Ceiling)})
	c.Text(78, s.px(p.Ceiling)+15, "ceiling "+Number(p.Ceiling, 4), Type{Size: 12})
	c.Line(Style{Stroke: Accent, Width: 3}, along(x, s, p.Planned)...)
	c.Line(Style{Stroke: Series2, Width: 3}, along(x, s, p.Done)...)
	if p.Now > p.From && p.Now < p.To {
		c.Line(Style{Stroke: Alarm, Width: 1.5}, Point{x.px(p.Now), y}, Point{x.px(p.Now), y + h})
		c.Text(x.px(p.Now)+5, y+13, "now", Type{Size: 11, Ink: Alarm})
	}
	end := 0.0
	if n := len(p.Planned); n > 0 {
		end = p.Planned[n-1].Value
		c.Text(966, s.px(end)-9, "plan "+Number(end, 4), Type{Size: 12, Ink: Accent, Anchor: End, Bold: true})
	}
	c.Alt = fmt.Sprintf("Coverage against time: the plan rises to %s, under a ceiling of %s.", Number(end, 4), Number(p.Ceiling, 4))
	if n := len(p.Done); n > 0 {
		c.Alt += fmt.Sprintf(" Done so far: %s.", Number(p.Done[n-1].Value, 4))
	}
	if b := p.Band; b != nil && len(b.T) > 0 {
		k := len(b.T) - 1
		c.Alt += fmt.Sprintf(" With weather, %s: %s to %s at the end.", b.Text, Number(b.Low[k], 4), Number(b.High[k], 4))
	}
	return c
}

func along(x, y scale, marks []Mark) []Point {
	var out []Point
	for _, m := range marks {
		out = append(out, Point{x.px(m.T), y.px(m.Value)})
	}
	return out
}
