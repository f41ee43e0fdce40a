package footprint

import (
	"bytes"
	"encoding/xml"
	"fmt"
	"math"
	"slices"
	"strings"

	"nightwright/visibility"
)

// Mollweide projects a right ascension and declination (rad) onto an ellipse
// 4 by 2 wide, equal in area: right ascension pi in the middle, east to the
// left. Source: Snyder 1987, USGS Professional Paper 1395, p. 249.
func Mollweide(ra, dec float64) (x, y float64) {
	t := dec
	if math.Abs(dec) > math.Pi/2-1e-9 {
		t = math.Copysign(math.Pi/2, dec)
	} else {
		// Newton's steps for 2 t + sin 2 t = pi sin dec; near the poles the
		// root is double and they get slow, so there are many.
		for range 60 {
			step := (2*t + math.Sin(2*t) - math.Pi*math.Sin(dec)) / (2 + 2*math.Cos(2*t))
			t -= step
			if math.Abs(step) < 1e-12 {
				break
			}
		}
	}
	lon := math.Remainder(ra-math.Pi, 2*math.Pi)
	return -2 * lon / math.Pi * math.Cos(t), math.Sin(t)
}

// colours of the programs in turn: Okabe & Ito's set for all kinds of colour
// vision (from memory).
var colours = []string{"#0072b2", "#d55e00", "#009e73", "#cc79a7", "#e69f00", "#56b4e9", "#7a6a00"}

// Picture draws the fields of a tiling on the whole sky as SVG: an equal-area
// map with the ecliptic (dashed) and the galactic plane (dotted), a colour
// for each program. diameter is a field's, rad.
func Picture(name string, fields []Field, diameter float64) []byte {
	var b bytes.Buffer
	const scale, cx, cy = 240.0, 500.0, 290.0
	text := func(s string) string {
		var t strings.Builder
		_ = xml.EscapeText(&t, []byte(s)) // a Builder takes everything
		return t.String()
	}
	var programs []string
	for i := range fields {
		if !slices.Contains(programs, fields[i].Program) {
			programs = append(programs, fields[i].Program)
		}
	}
	title := fmt.Sprintf("%d fields of %.3g deg", len(fields), diameter*180/math.Pi)
	if name != "" {
		title = name + ": " + title
	}
	fmt.Fprintf(&b, `<svg xmlns="http://www.w3.org/2000/svg" viewBox="-35 0 1070 590" role="img" font-family="sans-serif" font-size="14">
<title>%s</title>
<rect x="-35" width="1070" height="590" fill="#fff"/>
<text x="500" y="28" text-anchor="middle" font-size="18" fill="#222">%s</text>
<ellipse cx="%g" cy="%g" rx="%g" ry="%g" fill="#f5f6f8" stroke="#555"/>
`, text(title), text(title), cx, cy, 2*scale, scale)
	place := func(ra, dec float64) (x, y float64) {
		x, y = Mollweide(ra, dec)
		return cx + scale*x, cy - scale*y
	}
	// line draws a curve through the sky, broken where it leaves one edge of
	// the map for the other.
	line := func(style string, at func(k int) (ra, dec float64)) {
		fmt.Fprintf(&b, `<path fill="none" %s d="`, style)
		far := math.Inf(1)
		for k := range 361 {
			x, y := place(at(k))
			step := "L"
			if math.Abs(x-far) > scale/2 {
				step = "M"
			}
			fmt.Fprintf(&b, "%s%.1f %.1f", step, x, y)
			far = x
		}
		b.WriteString("\"/>\n")
	}
	for dec := -60; dec <= 60; dec += 30 {
		line(`stroke="#ccd" stroke-width="0.7"`, func(k int) (float64, float64) { return (0.001 + float64(k)*0.99999) * degree, float64(dec) * degree })
	}
	for ra := 30; ra < 360; ra += 30 {
		line(`stroke="#ccd" stroke-width="0.7"`, func(k int) (float64, float64) { return float64(ra) * degree, (float64(k)/2 - 90) * degree })
	}
	radius := max(0.7, scale/math.Sqrt2*diameter/2) // the map's area is half the sphere's
	for k, p := range programs {
		c := colours[k%len(colours)]
		fmt.Fprintf(&b, `<g fill="%s" fill-opacity="0.35" stroke="%s" stroke-width="0.4">`+"\n", c, c)
		for i := range fields {
			if fields[i].Program == p {
				x, y := place(fields[i].RA, fields[i].Dec)
				fmt.Fprintf(&b, `<circle cx="%.1f" cy="%.1f" r="%.2f"/>`+"\n", x, y, radius)
			}
		}
		b.WriteString("</g>\n")
		fmt.Fprintf(&b, `<circle cx="30" cy="%d" r="6" fill="%s" fill-opacity="0.6"/><text x="42" y="%d" fill="#222">%s</text>`+"\n", 50+20*k, c, 55+20*k, text(p))
	}
	line(`stroke="#333" stroke-dasharray="7 4"`, func(k int) (float64, float64) { return visibility.Ecliptic.ToICRS(float64(k)*degree, 0) })
	line(`stroke="#333" stroke-dasharray="1.5 3"`, func(k int) (float64, float64) { return visibility.Galactic.ToICRS(float64(k)*degree, 0) })
	for ra := 60; ra < 360; ra += 60 {
		x, y := place(float64(ra)*degree, 0)
		fmt.Fprintf(&b, `<text x="%.0f" y="%.0f" text-anchor="middle" fill="#444" font-size="12">%d°</text>`+"\n", x, y-4, ra)
	}
	for dec := -60; dec <= 60; dec += 30 {
		x, y := place(359.99*degree, float64(dec)*degree)
		fmt.Fprintf(&b, `<text x="%.0f" y="%.0f" text-anchor="end" fill="#444" font-size="12">%+d°</text>`+"\n", x-8, y+4, dec)
	}
	b.WriteString(`<text x="500" y="565" text-anchor="middle" fill="#444">right ascension grows to the left; dashed: ecliptic, dotted: galactic plane</text>
</svg>
`)
	return b.Bytes()
}
