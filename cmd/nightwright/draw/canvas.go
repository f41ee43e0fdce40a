package draw

import (
	"math"
	"strconv"
)

// Point is a place on a picture, px.
type Point struct{ X, Y float64 }

// Style says how a shape looks. The zero value shows nothing.
type Style struct {
	Fill, Stroke Ink
	Width        float64 // of the stroke, px
	Dash         string  // lengths on and off, px, such as "6 3"; "" is a whole line
	Opacity      float64 // of all of it, 0 to 1; 0 means 1
}

// Anchor says which part of a text stands at its point.
type Anchor uint8

// The anchors.
const (
	Start Anchor = iota
	Middle
	End
)

// Type says how a text looks.
type Type struct {
	Size   float64 // px; 0 means 12
	Ink    Ink     // NoInk means Text
	Anchor Anchor
	Bold   bool
}

type shapeKind uint8

const (
	polygon shapeKind = iota
	polyline
	circle
	words
)

// shape is one mark. Circles have one point and a radius, words one point.
type shape struct {
	kind  shapeKind
	style Style
	typ   Type
	at    []Point
	r     float64
	text  string
	hint  string
}

// Canvas is a picture in the making.
type Canvas struct {
	Name  string  // of files and of ids in a page: small letters and hyphens
	Title string  // what it shows, in a few words
	Alt   string  // what it says, for who can't see it
	W, H  float64 // px

	shapes []shape
	hint   string
}

// New starts a picture.
func New(name, title string, w, h float64) *Canvas {
	return &Canvas{Name: name, Title: title, W: w, H: h}
}

func (c *Canvas) add(s shape) {
	s.hint, c.hint = c.hint, ""
	c.shapes = append(c.shapes, s)
}

// Hint gives the next shape a text that shows under the pointer.
func (c *Canvas) Hint(text string) { c.hint = text }

// Rect draws a rectangle.
func (c *Canvas) Rect(x, y, w, h float64, s Style) {
	if w <= 0 || h <= 0 {
		c.hint = ""
		return
	}
	c.add(shape{kind: polygon, style: s, at: []Point{{x, y}, {x + w, y}, {x + w, y + h}, {x, y + h}}})
}

// Polygon draws a closed shape of at least three points.
func (c *Canvas) Polygon(at []Point, s Style) {
	if len(at) > 2 {
		c.add(shape{kind: polygon, style: s, at: at})
	}
}

// Line draws an open line through points.
func (c *Canvas) Line(s Style, at ...Point) {
	if len(at) > 1 {
		c.add(shape{kind: polyline, style: s, at: at})
	}
}

// Circle draws a circle.
func (c *Canvas) Circle(x, y, r float64, s Style) {
	c.add(shape{kind: circle, style: s, at: []Point{{x, y}}, r: r})
}

// Text writes words with their baseline at y.
func (c *Canvas) Text(x, y float64, text string, t Type) {
	if text == "" {
		return
	}
	if t.Size == 0 {
		t.Size = 12
	}
	if t.Ink == NoInk {
		t.Ink = Text
	}
	c.add(shape{kind: words, typ: t, at: []Point{{x, y}}, text: text})
}

// Grow makes a picture higher, for what is only known once it is drawn.
func (c *Canvas) Grow(h float64) { c.H = max(c.H, h) }

// Clip shortens a text to so many characters.
func Clip(text string, most int) string {
	r := []rune(text)
	if len(r) <= most {
		return text
	}
	return string(r[:most-1]) + "…"
}

// Number writes a number with so many decimals, without trailing zeros.
func Number(x float64, decimals int) string {
	p := math.Pow(10, float64(decimals))
	return strconv.FormatFloat(math.Round(x*p)/p+0, 'f', -1, 64) // + 0 makes -0 of tiny negatives 0
}
