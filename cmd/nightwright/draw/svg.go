package draw

import (
	"bytes"
	"encoding/xml"
	"fmt"
	"math"
	"strconv"
	"strings"
)

// Inline writes the picture as SVG to stand in a page that has StyleSheet.
func (c *Canvas) Inline() []byte {
	var b bytes.Buffer
	c.open(&b, "")
	c.body(&b)
	b.WriteString("</svg>\n")
	return b.Bytes()
}

// SVG writes the picture as a file of its own. Programs that know no style
// sheets show it in the colours of light paper.
func (c *Canvas) SVG() []byte {
	var b bytes.Buffer
	c.open(&b, ` xmlns="http://www.w3.org/2000/svg"`)
	fmt.Fprintf(&b, "<style>%s</style>\n", StyleSheet())
	fmt.Fprintf(&b, `<rect class="f-paper" fill="#fff" width="%s" height="%s"/>`+"\n", coord(c.W), coord(c.H))
	c.body(&b)
	b.WriteString("</svg>\n")
	return b.Bytes()
}

func (c *Canvas) open(b *bytes.Buffer, attributes string) {
	fmt.Fprintf(b, `<svg%s class="picture" viewBox="0 0 %s %s" width="%s" height="%s" role="img" aria-labelledby="%s-t %s-d" font-family="system-ui,'Liberation Sans',Arial,sans-serif">`+"\n",
		attributes, coord(c.W), coord(c.H), coord(c.W), coord(c.H), c.Name, c.Name)
	fmt.Fprintf(b, `<title id="%s-t">%s</title><desc id="%s-d">%s</desc>`+"\n", c.Name, Escape(c.Title), c.Name, Escape(c.Alt))
}

// Escape makes a text fit to stand in XML.
func Escape(text string) string {
	var t strings.Builder
	_ = xml.EscapeText(&t, []byte(text)) // a Builder takes everything
	return t.String()
}

// body writes the shapes; neighbours that look alike share a group, and
// polygons and lines in it one path.
func (c *Canvas) body(b *bytes.Buffer) {
	for i := 0; i < len(c.shapes); {
		s := &c.shapes[i]
		if s.kind == words {
			i = c.texts(b, i)
			continue
		}
		j := i
		for j < len(c.shapes) && c.shapes[j].kind != words && c.shapes[j].style == s.style {
			j++
		}
		c.group(b, c.shapes[i:j])
		i = j
	}
}

func (c *Canvas) group(b *bytes.Buffer, shapes []shape) {
	b.WriteString("<g" + styleOf(shapes[0].style) + ">")
	open := false
	end := func() {
		if open {
			b.WriteString(`"/>`)
			open = false
		}
	}
	for i := range shapes {
		s := &shapes[i]
		if s.kind == circle {
			end()
			fmt.Fprintf(b, `<circle cx="%s" cy="%s" r="%s"`, coord(s.at[0].X), coord(s.at[0].Y), coord(s.r))
			closeWith(b, "circle", s.hint)
			continue
		}
		if s.hint != "" {
			end()
			b.WriteString(`<path d="`)
			outline(b, s)
			b.WriteString(`"`)
			closeWith(b, "path", s.hint)
			continue
		}
		if !open {
			b.WriteString(`<path d="`)
			open = true
		}
		outline(b, s)
	}
	end()
	b.WriteString("</g>\n")
}

func closeWith(b *bytes.Buffer, tag, hint string) {
	if hint == "" {
		b.WriteString("/>")
		return
	}
	fmt.Fprintf(b, "><title>%s</title></%s>", Escape(hint), tag)
}

// outline writes a path in tenths of a pixel, each step from the rounded
// place before it, so that roundings don't add up.
func outline(b *bytes.Buffer, s *shape) {
	var px, py int
	for k, p := range s.at {
		x, y := int(math.Round(p.X*10)), int(math.Round(p.Y*10))
		switch {
		case k == 0:
			b.WriteString("M" + tenths(x) + " " + tenths(y))
		case x == px && y == py:
			continue
		case y == py:
			b.WriteString("h" + tenths(x-px))
		case x == px:
			b.WriteString("v" + tenths(y-py))
		default:
			b.WriteString("l" + tenths(x-px))
			if y > py {
				b.WriteByte(' ')
			}
			b.WriteString(tenths(y - py))
		}
		px, py = x, y
	}
	if s.kind == polygon {
		b.WriteByte('z')
	}
}

func tenths(v int) string {
	sign := ""
	if v < 0 {
		sign, v = "-", -v
	}
	switch {
	case v%10 == 0:
		return sign + strconv.Itoa(v/10)
	case v < 10:
		return sign + "." + strconv.Itoa(v)
	}
	return sign + strconv.Itoa(v/10) + "." + strconv.Itoa(v%10)
}

func coord(x float64) string { return tenths(int(math.Round(x * 10))) }

// styleOf writes a style as classes, with the light colours as attributes for
// programs that know no classes.
func styleOf(s Style) string {
	var class []string
	var b strings.Builder
	if s.Fill != NoInk {
		class = append(class, "f-"+inks[s.Fill].name)
		fmt.Fprintf(&b, ` fill="%s"`, inks[s.Fill].light)
	} else {
		b.WriteString(` fill="none"`)
	}
	if s.Stroke != NoInk {
		class = append(class, "l-"+inks[s.Stroke].name)
		fmt.Fprintf(&b, ` stroke="%s" stroke-width="%s" stroke-linejoin="round" stroke-linecap="round"`, inks[s.Stroke].light, Number(s.Width, 2))
	}
	if s.Dash != "" {
		fmt.Fprintf(&b, ` stroke-dasharray="%s"`, Escape(s.Dash))
	}
	if s.Opacity > 0 && s.Opacity < 1 {
		fmt.Fprintf(&b, ` opacity="%s"`, Number(s.Opacity, 3))
	}
	if len(class) > 0 {
		fmt.Fprintf(&b, ` class="%s"`, strings.Join(class, " "))
	}
	return b.String()
}

func (c *Canvas) texts(b *bytes.Buffer, i int) int {
	t := c.shapes[i].typ
	fmt.Fprintf(b, `<g class="f-%s" fill="%s" font-size="%s"`, inks[t.Ink].name, inks[t.Ink].light, Number(t.Size, 1))
	if t.Bold {
		b.WriteString(` font-weight="600"`)
	}
	switch t.Anchor {
	case Middle:
		b.WriteString(` text-anchor="middle"`)
	case End:
		b.WriteString(` text-anchor="end"`)
	}
	b.WriteString(">")
	for ; i < len(c.shapes) && c.shapes[i].kind == words && c.shapes[i].typ == t; i++ {
		s := &c.shapes[i]
		fmt.Fprintf(b, `<text x="%s" y="%s">%s</text>`, coord(s.at[0].X), coord(s.at[0].Y), Escape(s.text))
	}
	b.WriteString("</g>\n")
	return i
}
