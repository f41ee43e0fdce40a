package draw

import (
	"fmt"
	"math"
)

// Balance is what is asked for, what is planned and what there is, in hours.
type Balance struct {
	Label               string
	Asked, Planned, Has float64
}

// Balances draws demand against supply: a plot for right ascension, one for
// months.
func Balances(name, title string, ascension, months []Balance) *Canvas {
	c := New(name, title, 1000, 326)
	y := c.legend(60, 18, 900, []Key{
		{Style{Fill: Ramp1}, "open telescope time", false},
		{Style{Fill: Series0}, "planned", false},
		{Style{Stroke: Series1, Width: 3}, "asked for", true},
	})
	width := 880 * float64(len(ascension)) / float64(len(ascension)+max(len(months), 2)+1)
	width = min(max(width, 330), 600)
	c.balancePlot(60, y+38, width, 210, "by right ascension, hours; open time with it on the meridian", ascension)
	c.balancePlot(60+width+66, y+38, 1000-60-66-20-width, 210, "by month, hours", months)
	tight, worst := "", 0.0
	for _, b := range ascension {
		if b.Has > 0 && b.Asked/b.Has > worst {
			tight, worst = b.Label, b.Asked/b.Has
		}
	}
	c.Text(60, 316, "Asked for: each field's hours, gaps included, spread over the open time in which it stands high enough.", Type{Size: 11, Ink: Soft})
	c.Alt = fmt.Sprintf("Bars of hours asked for, planned and open by right ascension and by month. Tightest at right ascension %s h: %.2f times the open time is asked for.", tight, worst)
	if tight == "" {
		c.Alt = "Bars of hours asked for, planned and open by right ascension and by month."
	}
	return c
}

func (c *Canvas) balancePlot(x, y, w, h float64, unit string, all []Balance) {
	most := 0.0
	for _, b := range all {
		most = max(most, b.Asked, b.Planned, b.Has)
	}
	s := c.frame(x, y, w, h, 0, top(most*1.02), "")
	c.Text(x, y-12, unit, Type{Size: 12, Bold: true})
	if len(all) == 0 {
		return
	}
	step := w / float64(len(all))
	wide := min(step*0.72, 74)
	for k, b := range all {
		at := x + step*(float64(k)+0.5)
		c.Hint(fmt.Sprintf("%s: open %.1f h", b.Label, b.Has))
		c.Rect(at-wide/2, s.px(b.Has), wide, s.at-s.px(b.Has), Style{Fill: Ramp1})
	}
	for k, b := range all {
		at := x + step*(float64(k)+0.5)
		c.Hint(fmt.Sprintf("%s: planned %.1f h", b.Label, b.Planned))
		c.Rect(at-wide*0.28, s.px(b.Planned), wide*0.56, s.at-s.px(b.Planned), Style{Fill: Series0})
	}
	for k, b := range all {
		at := x + step*(float64(k)+0.5)
		c.Line(Style{Stroke: Series1, Width: 3}, Point{at - wide/2, s.px(b.Asked)}, Point{at + wide/2, s.px(b.Asked)})
	}
	for k, b := range all {
		c.Text(x+step*(float64(k)+0.5), s.at+16, b.Label, Type{Size: 11, Ink: Soft, Anchor: Middle})
	}
}

// Bin is a bar of a histogram, [From, To) in the axis' unit.
type Bin struct {
	Label string
	Count []int // by series
}

// Histogram draws bars stacked by series.
func Histogram(name, title, unit, below string, series []string, bins []Bin) *Canvas {
	c := New(name, title, 1000, 320)
	var keys []Key
	for k, s := range series {
		keys = append(keys, Key{Style{Fill: Series(k)}, Clip(s, 28), false})
	}
	y := c.legend(70, 18, 900, keys) + 26
	most, all := 0, 0
	for _, b := range bins {
		sum := 0
		for _, n := range b.Count {
			sum += n
		}
		most, all = max(most, sum), all+sum
	}
	h := 262 - y
	s := c.frame(70, y, 900, h, 0, top(float64(most)), "")
	c.Text(70, y-10, unit, Type{Size: 12, Bold: true})
	if len(bins) == 0 {
		return c
	}
	step := 900 / float64(len(bins))
	for k := range series {
		for i, b := range bins {
			base := 0
			for _, n := range b.Count[:k] {
				base += n
			}
			lo, hi := s.px(float64(base)), s.px(float64(base+b.Count[k]))
			c.Hint(fmt.Sprintf("%s, %s: %d", b.Label, series[k], b.Count[k]))
			c.Rect(70+step*(float64(i)+0.09), hi, step*0.82, lo-hi, Style{Fill: Series(k)})
		}
	}
	for i, b := range bins {
		c.Text(70+step*(float64(i)+0.5), y+h+16, b.Label, Type{Size: 11, Ink: Soft, Anchor: Middle})
	}
	c.Text(520, y+h+38, below, Type{Size: 12, Ink: Soft, Anchor: Middle})
	best := 0
	for i, b := range bins {
		if sum(b.Count) > sum(bins[best].Count) {
			best = i
		}
	}
	c.Alt = fmt.Sprintf("Histogram of %d values; most of them, %d, at %s.", all, sum(bins[best].Count), bins[best].Label)
	return c
}

func sum(v []int) int {
	n := 0
	for _, x := range v {
		n += x
	}
	return n
}

// Estimate is a value with its interval.
type Estimate struct {
	Label       string
	Value       float64
	Low, High   float64
	Note        string
	Highlighted bool
}

// The sides of the plot of estimates, px.
const estLeft, estRight = 230.0, 690.0

// Estimates draws values with their intervals, one below the other, on one
// axis; zero, where it is in sight, is marked.
func Estimates(name, title, unit string, all []Estimate) *Canvas {
	c := New(name, title, 1000, 62+30*float64(len(all)))
	lo, hi := math.Inf(1), math.Inf(-1)
	for _, e := range all {
		lo, hi = min(lo, e.Low, e.Value), max(hi, e.High, e.Value)
	}
	if len(all) == 0 {
		lo, hi = 0, 1
	}
	if hi == lo {
		lo, hi = lo-0.5, hi+0.5
	}
	pad := (hi - lo) * 0.06
	s := scale{lo - pad, hi + pad, estLeft, estRight}
	h := 30 * float64(len(all))
	c.Text(estLeft, 22, unit, Type{Size: 12, Bold: true})
	c.Rect(estLeft, 34, estRight-estLeft, h, Style{Fill: Panel})
	marks, decimals := nice(s.from, s.to, 6)
	for _, m := range marks {
		style := Style{Stroke: Grid, Width: 1}
		if math.Abs(m) < 1e-12 {
			style = Style{Stroke: Axis, Width: 1.5}
		}
		c.Line(style, Point{s.px(m), 34}, Point{s.px(m), 34 + h})
		c.Text(s.px(m), 34+h+16, Number(m, decimals), Type{Size: 11, Ink: Soft, Anchor: Middle})
	}
	for k, e := range all {
		y := 34 + 30*(float64(k)+0.5)
		ink := Series0
		if e.Highlighted {
			ink = Series1
		}
		c.Line(Style{Stroke: ink, Width: 2.5}, Point{s.px(e.Low), y}, Point{s.px(e.High), y})
		c.Circle(s.px(e.Value), y, 5, Style{Fill: ink, Stroke: Paper, Width: 1})
		c.Text(estLeft-12, y+4, Clip(e.Label, 32), Type{Anchor: End, Bold: e.Highlighted})
		c.Text(estRight+12, y+4, Clip(e.Note, 46), Type{Ink: Soft})
	}
	c.Alt = title + "."
	for _, e := range all {
		c.Alt += fmt.Sprintf(" %s: %s (%s to %s).", e.Label, Number(e.Value, 4), Number(e.Low, 4), Number(e.High, 4))
	}
	return c
}
