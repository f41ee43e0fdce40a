package draw

import (
	"bytes"
	"encoding/xml"
	"errors"
	"image/png"
	"io"
	"math"
	"strings"
	"testing"

	"nightwright/visibility"
)

// luminance is the relative luminance of a colour: WCAG 2.1, "relative
// luminance" in its glossary.
func luminance(i Ink, dark bool) float64 {
	c := i.rgba(dark)
	lin := func(v uint8) float64 {
		x := float64(v) / 255
		if x <= 0.04045 {
			return x / 12.92
		}
		return math.Pow((x+0.055)/1.055, 2.4)
	}
	return 0.2126*lin(c.R) + 0.7152*lin(c.G) + 0.0722*lin(c.B)
}

// contrast is WCAG 2.1's contrast ratio.
func contrast(a, b Ink, dark bool) float64 {
	x, y := luminance(a, dark), luminance(b, dark)
	return (max(x, y) + 0.05) / (min(x, y) + 0.05)
}

// TestContrast holds the inks against WCAG 2.1 AA: 1.4.3 for text, 1.4.11 for
// marks that carry meaning.
func TestContrast(t *testing.T) {
	for _, dark := range []bool{false, true} {
		for _, ground := range []Ink{Paper, Panel} {
			for _, ink := range []Ink{Text, Soft, Alarm, Accent} {
				if got := contrast(ink, ground, dark); got < 4.5 {
					t.Errorf("dark %v: %s on %s has contrast %.2f; want 4.5", dark, inks[ink].name, inks[ground].name, got)
				}
			}
			for ink := Series0; ink <= Series6; ink++ {
				if got := contrast(ink, ground, dark); got < 3 {
					t.Errorf("dark %v: %s on %s has contrast %.2f; want 3", dark, inks[ink].name, inks[ground].name, got)
				}
			}
		}
		for ink := Ramp1; ink <= Ramp5; ink++ {
			if got := contrast(ink, ink-1, dark); got < 1.25 {
				t.Errorf("dark %v: %s and the step before have contrast %.2f; want 1.25", dark, inks[ink].name, got)
			}
			if (luminance(ink, dark) > luminance(ink-1, dark)) != dark {
				t.Errorf("dark %v: the ramp turns at %s", dark, inks[ink].name)
			}
		}
	}
}

// area is a polygon's, px^2, by the shoelace formula.
func area(at []Point) float64 {
	s := 0.0
	for k, b := range at {
		a := at[(k+len(at)-1)%len(at)]
		s += a.X*b.Y - b.X*a.Y
	}
	return math.Abs(s) / 2
}

// TestCirclesKeepTheirArea draws circles all over the sky, on the edge and on
// the poles too: on an equal-area map of 2 sqrt 2 by sqrt 2 radii the pieces of
// a cap have 2 pi (1 - cos r) times 2 scale^2 of it (a map of pi*2*1 scales^2
// for 4 pi).
func TestCirclesKeepTheirArea(t *testing.T) {
	f := skyFrame{500, 250, 230}
	tests := []struct{ ra, dec, r float64 }{
		{180, 0, 5}, {0, 0, 5}, {359, 20, 5}, {1, -60, 8}, {0, 70, 8}, {90, 89, 6}, {0, 90, 10}, {180, -90, 10}, {2, -88, 4}, {359.99, 45, 20}, {270, 30, 1},
	}
	for _, tt := range tests {
		got := 0.0
		rings := capOutlines(tt.ra*math.Pi/180, tt.dec*math.Pi/180, tt.r*math.Pi/180, 240)
		for _, ring := range rings {
			got += area(f.points(ring))
			for _, s := range ring {
				if math.Abs(s.lon) > math.Pi+1e-9 || math.Abs(s.lat) > math.Pi/2+1e-9 {
					t.Fatalf("%v: a corner at %v lies outside the map", tt, s)
				}
			}
		}
		want := 2 * math.Pi * (1 - math.Cos(tt.r*math.Pi/180)) * f.scale * f.scale / 2
		if math.Abs(got/want-1) > 0.01 {
			t.Errorf("%v: %d pieces of %.1f px^2; want %.1f", tt, len(rings), got, want)
		}
	}
	if n := len(capOutlines(0.01, 0, 0.1, 24)); n != 2 {
		t.Errorf("a circle across the map's edge has %d pieces; want 2", n)
	}
	if n := len(capOutlines(1, 0, 0.1, 24)); n != 1 {
		t.Errorf("a circle inside the map has %d pieces; want 1", n)
	}
}

// TestBoxesKeepTheirArea does the same for rectangles: 4 asin(sin w/2 sin h/2).
func TestBoxesKeepTheirArea(t *testing.T) {
	f := skyFrame{500, 250, 230}
	for _, tt := range []struct{ ra, dec, w, h float64 }{
		{180, 0, 10, 4}, {0, 0, 10, 4}, {359, 40, 6, 9}, {90, 88, 8, 8}, {0, 90, 10, 6}, {10, -89, 5, 7}, {200, 60, 20, 20},
	} {
		got := 0.0
		rings := boxOutlines(tt.ra*math.Pi/180, tt.dec*math.Pi/180, tt.w*math.Pi/180, tt.h*math.Pi/180, 60)
		for _, ring := range rings {
			got += area(f.points(ring))
		}
		want := 4 * math.Asin(math.Sin(tt.w*math.Pi/360)*math.Sin(tt.h*math.Pi/360)) * f.scale * f.scale / 2
		if math.Abs(got/want-1) > 0.012 {
			t.Errorf("%v: %d pieces of %.1f px^2; want %.1f", tt, len(rings), got, want)
		}
	}
}

// TestNoCurveCrossesTheMap: a line on the sky that leaves the map on one side
// comes back on the other, and is never drawn across.
func TestNoCurveCrossesTheMap(t *testing.T) {
	c := New("x", "x", 1000, 500)
	c.skyLines(skyFrame{500, 250, 230})
	for _, s := range c.shapes {
		for k := 1; s.kind == polyline && k < len(s.at); k++ {
			if d := math.Hypot(s.at[k].X-s.at[k-1].X, s.at[k].Y-s.at[k-1].Y); d > 40 {
				t.Errorf("a step of %.0f px from %v to %v", d, s.at[k-1], s.at[k])
			}
		}
	}
}

const hostile = `<script>alert("1")</script>&'` + "\x00"

// everyPicture makes one of each kind from hostile names.
func everyPicture() []*Canvas {
	night := visibility.Interval{From: 0, To: 86400}
	dark := []visibility.Interval{{From: 30000, To: 60000}}
	site := CalendarSite{Name: hostile, Telescopes: []string{hostile}, Use: [][]CalendarUse{{{9, 8, 1e-4, 3}, {}}}}
	for k := range 2 {
		site.Nights = append(site.Nights, CalendarNight{hostile, 43200 + 86400*float64(k), dark, dark, dark, dark, 0.7})
	}
	curve := Curve{T: []float64{0, 86400}, Altitude: []float64{0.1, 0.9}}
	return []*Canvas{
		SkyMap("sky", hostile, []SkyField{{0, 1.5, 0.1, 0.3, false, hostile}, {3, 0, 0.01, 1, true, ""}}),
		Tiles("tiles", hostile, []string{hostile, "b"}, []Tile{{RA: 1, Dec: 1.5, Width: 0.1, Height: 0.05}, {RA: 0, Dec: 0, Radius: 0.05, Kind: 1}}, hostile),
		Balances("balance", hostile, []Balance{{hostile, 3, 2, 1}}, []Balance{{hostile, 3, 2, 1}}),
		Calendar("calendar", hostile, []CalendarSite{site}, []float64{0, 86400}),
		Lanes("night", hostile, []string{hostile}, []Lane{{Title: hostile, Span: night, Set: dark, Nautical: dark, Dark: dark, Open: dark, Curves: []Curve{curve}, Moon: curve, Blocks: []Block{{40000, 41000, 0, 0, hostile}}, Note: hostile}}),
		Progress("progress", hostile, Course{0, 86400 * 30, []Mark{{0, 0}, {86400, 0.5}}, []Mark{{0, 0.1}}, 0.7, &Band{hostile, []float64{0, 86400}, []float64{0, 0.2}, []float64{0, 0.4}, []float64{0, 0.3}}, 86400}),
		Histogram("cadence", hostile, "n", "d", []string{hostile}, []Bin{{hostile, []int{3}}}),
		Estimates("networks", hostile, "coverage", []Estimate{{hostile, 0.5, 0.4, 0.6, hostile, true}}),
	}
}

func TestPicturesAreWellFormed(t *testing.T) {
	for _, c := range everyPicture() {
		for form, text := range map[string][]byte{"file": c.SVG(), "inline": c.Inline()} {
			if bytes.Contains(text, []byte("<script")) || bytes.Contains(text, []byte("NaN")) || bytes.Contains(text, []byte("Inf")) {
				t.Errorf("%s, %s: a script, NaN or Inf in it", c.Name, form)
			}
			d := xml.NewDecoder(bytes.NewReader(text))
			for {
				if _, err := d.Token(); errors.Is(err, io.EOF) {
					break
				} else if err != nil {
					t.Fatalf("%s, %s: %v", c.Name, form, err)
				}
			}
		}
		if c.Alt == "" || !strings.Contains(string(c.SVG()), "<desc") {
			t.Errorf("%s has no text for who can't see it", c.Name)
		}
		var b bytes.Buffer
		if err := c.PNG(&b, 1); err != nil {
			t.Fatalf("%s: %v", c.Name, err)
		}
		img, err := png.Decode(&b)
		if err != nil || img.Bounds().Dx() != int(math.Ceil(c.W)) || img.Bounds().Dy() != int(math.Ceil(c.H)) {
			t.Errorf("%s: PNG of %v, %v; want %g by %g", c.Name, img.Bounds(), err, c.W, c.H)
		}
	}
}

// TestEmptyPictures: nothing to show is no reason to fail.
func TestEmptyPictures(t *testing.T) {
	for _, c := range []*Canvas{
		SkyMap("a", "", nil), Tiles("h", "", nil, nil, ""), Balances("b", "", nil, nil), Calendar("c", "", nil, nil), Lanes("d", "", nil, nil),
		Progress("e", "", Course{}), Histogram("f", "", "", "", nil, nil), Estimates("g", "", "", nil),
	} {
		if text := c.SVG(); bytes.Contains(text, []byte("NaN")) || bytes.Contains(text, []byte("Inf")) {
			t.Errorf("%s: NaN or Inf in %s", c.Name, text)
		}
		var b bytes.Buffer
		if err := c.PNG(&b, 1); err != nil {
			t.Errorf("%s: %v", c.Name, err)
		}
	}
}

// TestPathKeepsPlaces adds up the relative steps of a path: roundings must not.
func TestPathKeepsPlaces(t *testing.T) {
	s := shape{kind: polyline}
	for k := range 200 {
		s.at = append(s.at, Point{float64(k) * 1.23456, 50 + 20*math.Sin(float64(k)/7)})
	}
	var b bytes.Buffer
	outline(&b, &s)
	d := strings.NewReplacer("l", " l ", "h", " h ", "v", " v ", "M", " M ", "-", " -").Replace(b.String())
	var x, y float64
	words := strings.Fields(d)
	num := func() float64 {
		var v float64
		v, words = parse(t, words[0]), words[1:]
		return v
	}
	for len(words) > 0 {
		op := words[0]
		words = words[1:]
		switch op {
		case "M":
			x, y = num(), num()
		case "l":
			x += num()
			y += num()
		case "h":
			x += num()
		case "v":
			y += num()
		default:
			t.Fatalf("what is %q in %s", op, d)
		}
	}
	last := s.at[len(s.at)-1]
	if math.Abs(x-last.X) > 0.051 || math.Abs(y-last.Y) > 0.051 {
		t.Errorf("the path ends at %.2f, %.2f; want %.2f, %.2f", x, y, last.X, last.Y)
	}
}

func TestRoundAxes(t *testing.T) {
	tests := []struct {
		from, to float64
		steps    int
		want     []float64
	}{
		{0, 10, 5, []float64{0, 2, 4, 6, 8, 10}},
		{0, 1, 5, []float64{0, 0.2, 0.4, 0.6, 0.8, 1}},
		{-1, 1, 4, []float64{-1, -0.5, 0, 0.5, 1}},
		{3, 3, 4, []float64{3}},
	}
	for _, tt := range tests {
		got, decimals := nice(tt.from, tt.to, tt.steps)
		if len(got) != len(tt.want) {
			t.Errorf("%v: %v; want %v", tt, got, tt.want)
			continue
		}
		for k := range got {
			if math.Abs(got[k]-tt.want[k]) > 1e-12 || strings.HasPrefix(Number(got[k], decimals), "-0 ") {
				t.Errorf("%v: %v; want %v", tt, got, tt.want)
			}
		}
	}
	if got := Number(-1e-17, 0); got != "0" {
		t.Errorf("a tiny negative is written %q; want 0", got)
	}
}

// TestDashes: the parts of a line of 100 px, 6 on and 4 off, are 60 px long.
func TestDashes(t *testing.T) {
	sum := 0.0
	for _, part := range dashes([]Point{{0, 0}, {33, 0}, {100, 0}}, "6 4", 1) {
		for k := 1; k < len(part); k++ {
			sum += part[k].X - part[k-1].X
		}
	}
	if math.Abs(sum-60) > 1e-9 {
		t.Errorf("%.3f px are drawn; want 60", sum)
	}
}
