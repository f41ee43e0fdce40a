package draw

import (
	"math"
	"time"
)

// scale maps values onto pixels.
type scale struct{ from, to, at, end float64 }

func (s scale) px(v float64) float64 {
	if s.to == s.from {
		return s.at
	}
	return s.at + (v-s.from)/(s.to-s.from)*(s.end-s.at)
}

// nice returns round numbers between two values, about so many steps apart
// that they stand well, and the number of decimals they need.
func nice(from, to float64, steps int) (at []float64, decimals int) {
	if !(to > from) {
		return []float64{from}, 0
	}
	raw := (to - from) / float64(steps)
	p := math.Pow(10, math.Floor(math.Log10(raw)))
	step := 10 * p
	for _, m := range []float64{1, 2, 5} {
		if m*p >= raw*0.999 {
			step = m * p
			break
		}
	}
	if step < 1 {
		decimals = int(math.Ceil(-math.Log10(step) - 1e-9))
	}
	for k := math.Ceil(from/step - 1e-9); k*step <= to+step*1e-9; k++ {
		at = append(at, k*step)
	}
	return at, decimals
}

// top rounds a greatest value up to where an axis may end.
func top(v float64) float64 {
	if !(v > 0) {
		return 1
	}
	marks, _ := nice(0, v, 5)
	if len(marks) < 2 {
		return v
	}
	return math.Ceil(v/marks[1]-1e-9) * marks[1]
}

// dates returns dates to write under a time axis (UTC Unix s) and how.
func dates(from, to float64, most int) (at []float64, text []string) {
	day := func(t float64) time.Time { return time.Unix(int64(t), 0).UTC() }
	days := (to - from) / 86400
	if days <= float64(7*most) {
		step := 1
		for _, s := range []int{1, 2, 5, 7, 10, 14} {
			if step = s; days/float64(s) <= float64(most) {
				break
			}
		}
		d := day(from)
		d = time.Date(d.Year(), d.Month(), d.Day(), 0, 0, 0, 0, time.UTC)
		for ; float64(d.Unix()) <= to; d = d.AddDate(0, 0, step) {
			if t := float64(d.Unix()); t >= from {
				at, text = append(at, t), append(text, d.Format("2 Jan"))
			}
		}
		return at, text
	}
	step := 1
	for days/30.4/float64(step) > float64(most) {
		step++
	}
	d := day(from)
	for d = time.Date(d.Year(), d.Month(), 1, 0, 0, 0, 0, time.UTC); float64(d.Unix()) <= to; d = d.AddDate(0, step, 0) {
		if t := float64(d.Unix()); t >= from {
			layout := "Jan"
			if d.Month() == time.January || len(at) == 0 {
				layout = "Jan 2006"
			}
			at, text = append(at, t), append(text, d.Format(layout))
		}
	}
	return at, text
}

// frame draws a plot's ground with guides at round values of y, written to
// the left, and returns the scale of y.
func (c *Canvas) frame(x, y, w, h, from, to float64, unit string) scale {
	s := scale{from, to, y + h, y}
	c.Rect(x, y, w, h, Style{Fill: Panel})
	marks, decimals := nice(from, to, max(2, int(h/34)))
	for _, m := range marks {
		c.Line(Style{Stroke: Grid, Width: 1}, Point{x, s.px(m)}, Point{x + w, s.px(m)})
	}
	for _, m := range marks {
		c.Text(x-7, s.px(m)+4, Number(m, decimals), Type{Size: 11, Ink: Soft, Anchor: End})
	}
	if unit != "" {
		c.Text(x-7, y-9, unit, Type{Size: 11, Ink: Soft, Anchor: Start})
	}
	return s
}

// timeAxis writes dates under a plot.
func (c *Canvas) timeAxis(s scale, y, h float64, most int) {
	at, text := dates(s.from, s.to, most)
	for _, t := range at {
		c.Line(Style{Stroke: Grid, Width: 1}, Point{s.px(t), y}, Point{s.px(t), y + h})
	}
	for k, t := range at {
		c.Text(s.px(t), y+h+16, text[k], Type{Size: 11, Ink: Soft, Anchor: Middle})
	}
}

// Key is an entry of a legend.
type Key struct {
	Style Style
	Text  string
	Line  bool // a stroke rather than a patch
}

// legend writes keys in a row from x, and on further rows where they don't
// fit; it returns the y below it.
func (c *Canvas) legend(x, y, w float64, keys []Key) float64 {
	at := x
	for _, k := range keys {
		need := 24 + textWidth(k.Text, 12)
		if at > x && at+need > x+w {
			at, y = x, y+18
		}
		if k.Line {
			c.Line(k.Style, Point{at, y - 4}, Point{at + 16, y - 4})
		} else {
			c.Rect(at, y-10, 14, 11, k.Style)
		}
		c.Text(at+20, y, k.Text, Type{Size: 12, Ink: Soft})
		at += need + 14
	}
	return y + 10
}

// textWidth estimates how wide words come out, px: wide enough for the usual
// faces without serifs.
func textWidth(text string, size float64) float64 {
	w := 0.0
	for _, r := range text {
		switch {
		case r == 'i' || r == 'l' || r == 'j' || r == 't' || r == 'f' || r == 'r' || r == ' ' || r == '.' || r == ',' || r == ':':
			w += 0.32
		case r == 'm' || r == 'w' || r == 'M' || r == 'W':
			w += 0.88
		case r > 0x2e80:
			w += 1
		case r >= 'A' && r <= 'Z':
			w += 0.68
		default:
			w += 0.56
		}
	}
	return w * size
}
