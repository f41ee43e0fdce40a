package draw

import (
	"image"
	"image/color"
	"image/draw"
	"image/png"
	"io"
	"math"
	"strconv"
	"strings"

	"golang.org/x/image/font"
	"golang.org/x/image/font/gofont/gobold"
	"golang.org/x/image/font/gofont/goregular"
	"golang.org/x/image/font/opentype"
	"golang.org/x/image/math/fixed"
	"golang.org/x/image/vector"
)

// PNG writes the picture in the colours of light paper, with so many dots for
// each pixel of the picture.
func (c *Canvas) PNG(w io.Writer, scale float64) error {
	p := &plotter{scale: scale, img: image.NewRGBA(image.Rect(0, 0, int(math.Ceil(c.W*scale)), int(math.Ceil(c.H*scale)))), faces: map[Type]font.Face{}}
	draw.Draw(p.img, p.img.Bounds(), image.NewUniform(Paper.rgba(false)), image.Point{}, draw.Src)
	for i := range c.shapes {
		s := &c.shapes[i]
		if s.kind == words {
			if err := p.words(s); err != nil {
				return err
			}
			continue
		}
		p.shape(s)
	}
	e := png.Encoder{CompressionLevel: png.DefaultCompression}
	return e.Encode(w, p.img)
}

// plotter turns shapes into dots.
type plotter struct {
	scale float64
	img   *image.RGBA
	faces map[Type]font.Face
}

func (p *plotter) shape(s *shape) {
	at := make([]Point, len(s.at))
	for i, q := range s.at {
		at[i] = Point{q.X * p.scale, q.Y * p.scale}
	}
	if s.kind == circle {
		at = round(at[0], s.r*p.scale)
	}
	if s.style.Fill != NoInk && s.kind != polyline {
		p.fill([][]Point{at}, s.style.Fill, s.style.Opacity)
	}
	if s.style.Stroke != NoInk {
		if s.kind != polyline {
			at = append(at, at[0])
		}
		width := max(s.style.Width*p.scale, 0.5)
		var pieces [][]Point
		for _, part := range dashes(at, s.style.Dash, p.scale) {
			pieces = append(pieces, thick(part, width/2)...)
		}
		p.fill(pieces, s.style.Stroke, s.style.Opacity)
	}
}

// round is a circle as a polygon.
func round(at Point, r float64) []Point {
	n := min(max(12, int(r*2)), 90)
	out := make([]Point, n)
	for k := range out {
		sin, cos := math.Sincos(2 * math.Pi * float64(k) / float64(n))
		out[k] = Point{at.X + r*cos, at.Y + r*sin}
	}
	return out
}

// thick makes a line with round ends and joints of convex pieces that all
// turn the same way, so that overlaps add up and never cancel.
func thick(at []Point, half float64) [][]Point {
	var out [][]Point
	for k := 1; k < len(at); k++ {
		a, b := at[k-1], at[k]
		dx, dy := b.X-a.X, b.Y-a.Y
		d := math.Hypot(dx, dy)
		if d == 0 {
			continue
		}
		nx, ny := -dy/d*half, dx/d*half
		out = append(out, []Point{{a.X - nx, a.Y - ny}, {b.X - nx, b.Y - ny}, {b.X + nx, b.Y + ny}, {a.X + nx, a.Y + ny}})
		if half > 0.7 {
			out = append(out, round(b, half))
		}
	}
	return out
}

// dashes cuts a line into the parts that are drawn.
func dashes(at []Point, dash string, scale float64) [][]Point {
	if dash == "" {
		return [][]Point{at}
	}
	var lengths []float64
	for _, word := range strings.Fields(dash) {
		if v, err := strconv.ParseFloat(word, 64); err == nil && v > 0 {
			lengths = append(lengths, v*scale)
		}
	}
	if len(lengths) < 2 {
		return [][]Point{at}
	}
	var out [][]Point
	turn, left, on := 0, lengths[0], true
	part := []Point{at[0]}
	for k := 1; k < len(at); k++ {
		a, b := at[k-1], at[k]
		for d := math.Hypot(b.X-a.X, b.Y-a.Y); d > left; d = math.Hypot(b.X-a.X, b.Y-a.Y) {
			a = Point{a.X + (b.X-a.X)*left/d, a.Y + (b.Y-a.Y)*left/d}
			if on {
				out = append(out, append(part, a))
			}
			part, on = []Point{a}, !on
			turn = (turn + 1) % len(lengths)
			left = lengths[turn]
		}
		left -= math.Hypot(b.X-a.X, b.Y-a.Y)
		part = append(part, b)
	}
	if on {
		out = append(out, part)
	}
	return out
}

// fill paints polygons as one shape.
func (p *plotter) fill(pieces [][]Point, ink Ink, opacity float64) {
	x0, y0, x1, y1 := math.Inf(1), math.Inf(1), math.Inf(-1), math.Inf(-1)
	for _, piece := range pieces {
		for _, q := range piece {
			x0, y0, x1, y1 = min(x0, q.X), min(y0, q.Y), max(x1, q.X), max(y1, q.Y)
		}
	}
	box := image.Rect(int(math.Floor(x0)), int(math.Floor(y0)), int(math.Ceil(x1))+1, int(math.Ceil(y1))+1).Intersect(p.img.Bounds())
	if box.Empty() || math.IsInf(x0, 0) {
		return
	}
	r := vector.NewRasterizer(box.Dx(), box.Dy())
	for _, piece := range pieces {
		for k, q := range piece {
			x, y := float32(q.X-float64(box.Min.X)), float32(q.Y-float64(box.Min.Y))
			if k == 0 {
				r.MoveTo(x, y)
			} else {
				r.LineTo(x, y)
			}
		}
		r.ClosePath()
	}
	r.Draw(p.img, box, image.NewUniform(faded(ink.rgba(false), opacity)), image.Point{})
}

func faded(c color.NRGBA, opacity float64) color.NRGBA {
	if opacity > 0 && opacity < 1 {
		c.A = uint8(math.Round(255 * opacity))
	}
	return c
}

func (p *plotter) words(s *shape) error {
	t := s.typ
	key := Type{Size: t.Size, Bold: t.Bold}
	face := p.faces[key]
	if face == nil {
		data := goregular.TTF
		if t.Bold {
			data = gobold.TTF
		}
		f, err := opentype.Parse(data)
		if err != nil {
			return err
		}
		if face, err = opentype.NewFace(f, &opentype.FaceOptions{Size: t.Size * p.scale * 0.94, DPI: 72, Hinting: font.HintingNone}); err != nil {
			return err
		}
		p.faces[key] = face
	}
	d := font.Drawer{Dst: p.img, Src: image.NewUniform(t.Ink.rgba(false)), Face: face}
	x := s.at[0].X * p.scale
	switch width := float64(d.MeasureString(s.text)) / 64; t.Anchor {
	case Middle:
		x -= width / 2
	case End:
		x -= width
	}
	d.Dot = fixed.Point26_6{X: fixed.Int26_6(x * 64), Y: fixed.Int26_6(s.at[0].Y * p.scale * 64)}
	d.DrawString(s.text)
	return nil
}
