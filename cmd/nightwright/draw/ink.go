package draw

import (
	"fmt"
	"image/color"
	"strconv"
	"strings"
)

// Ink is the role of a colour in a picture.
type Ink uint8

// The inks. Series are kinds that have no order, Ramps grow from little to
// much. Text has at least 4.5 times the paper's contrast and lines that carry
// meaning 3 times (WCAG 2.1, 1.4.3 and 1.4.11); a test checks it.
const (
	NoInk Ink = iota
	Paper
	Panel  // ground of a plot
	Text   // words and numbers
	Soft   // words of less weight
	Axis   // frames and axes
	Grid   // faint guides
	Alarm  // what is missing or wrong
	Day    // the Sun is up
	Dusk   // civil and nautical twilight
	Gloom  // astronomical twilight
	Dark   // the Sun under -18 deg
	Moon   // moonlight
	Accent // the one curve that matters
	Series0
	Series1
	Series2
	Series3
	Series4
	Series5
	Series6
	Ramp0
	Ramp1
	Ramp2
	Ramp3
	Ramp4
	Ramp5
	inkCount
)

// inks gives each ink's name in style sheets and its colour on light and on
// dark paper. Series are Okabe and Ito's set for all kinds of colour vision
// (2008, from memory), darkened on light paper and lightened on dark for
// contrast; ramps grow in one hue by lightness alone.
var inks = [inkCount]struct{ name, light, dark string }{
	Paper:   {"paper", "#ffffff", "#12161b"},
	Panel:   {"panel", "#f4f6f8", "#1a2027"},
	Text:    {"text", "#1b1f24", "#e8ecf0"},
	Soft:    {"soft", "#555d66", "#a9b3bd"},
	Axis:    {"axis", "#7a838c", "#7d8894"},
	Grid:    {"grid", "#d5dae0", "#333c46"},
	Alarm:   {"alarm", "#b8400a", "#ff9a5c"},
	Day:     {"day", "#f3ead2", "#4a4638"},
	Dusk:    {"dusk", "#b9c6da", "#35415a"},
	Gloom:   {"gloom", "#7f93b5", "#222c40"},
	Dark:    {"dark", "#33476b", "#0a0e16"},
	Moon:    {"moon", "#f2c14e", "#d9a520"},
	Accent:  {"accent", "#00629b", "#6cc0f0"},
	Series0: {"s0", "#0072b2", "#56b4e9"},
	Series1: {"s1", "#c65300", "#f08a3c"},
	Series2: {"s2", "#00805e", "#35c79a"},
	Series3: {"s3", "#a8478a", "#e29ac6"},
	Series4: {"s4", "#8f6700", "#edc04a"},
	Series5: {"s5", "#2a83b8", "#a6d8f5"},
	Series6: {"s6", "#5d6a00", "#c9d45a"},
	Ramp0:   {"r0", "#dce8f0", "#1f3344"},
	Ramp1:   {"r1", "#b2cfe1", "#2a5069"},
	Ramp2:   {"r2", "#7db0ce", "#3a7192"},
	Ramp3:   {"r3", "#478db8", "#5596bb"},
	Ramp4:   {"r4", "#1d6897", "#86bfdd"},
	Ramp5:   {"r5", "#0a416b", "#cbe8f8"},
}

// RampSteps is the number of steps of a ramp.
const RampSteps = 6

// Ramp returns the ink of a part, 0 to 1, in equal steps.
func Ramp(part float64) Ink {
	k := int(part * RampSteps)
	return Ramp0 + Ink(min(max(k, 0), RampSteps-1))
}

// Series returns the ink of the k-th kind; they come round.
func Series(k int) Ink { return Series0 + Ink(k%7) }

// rgba is an ink's colour.
func (i Ink) rgba(dark bool) color.NRGBA {
	text := inks[i].light
	if dark {
		text = inks[i].dark
	}
	v, err := strconv.ParseUint(strings.TrimPrefix(text, "#"), 16, 32)
	if err != nil {
		panic("draw: an ink's colour is no #rrggbb: " + text)
	}
	return color.NRGBA{uint8(v >> 16), uint8(v >> 8), uint8(v), 255}
}

// StyleSheet is the CSS that gives inks their colours: light, dark where the
// reader's system asks for it, light again on paper. Pages that hold pictures
// put it once; names are custom properties such as --text.
func StyleSheet() string {
	var light, dark strings.Builder
	for i := Paper; i < inkCount; i++ {
		fmt.Fprintf(&light, "--%s:%s;", inks[i].name, inks[i].light)
		fmt.Fprintf(&dark, "--%s:%s;", inks[i].name, inks[i].dark)
	}
	var b strings.Builder
	fmt.Fprintf(&b, ":root{color-scheme:light dark;%s}\n", light.String())
	fmt.Fprintf(&b, "@media screen and (prefers-color-scheme:dark){:root{%s}}\n", dark.String())
	for i := Paper; i < inkCount; i++ {
		fmt.Fprintf(&b, ".f-%[1]s{fill:var(--%[1]s)}.l-%[1]s{stroke:var(--%[1]s)}", inks[i].name)
	}
	b.WriteString("\n")
	return b.String()
}
