package sheet

import (
	"bufio"
	"fmt"
	"io"
	"math"
	"strings"
	"time"
	"unicode/utf8"

	"nightwright/scheduler/tables"
	"nightwright/visibility"
)

// width is the most characters of a line of text.
const width = 80

// WriteText writes the sheet as plain text of at most 80 columns.
func (s *Sheet) WriteText(w io.Writer) error {
	b := bufio.NewWriter(w)
	hang := func(indent int, text string) {
		for _, line := range wrap(text, width, indent) {
			b.WriteString(line)
			b.WriteByte('\n')
		}
	}
	p := func(format string, a ...any) {
		text := fmt.Sprintf(format, a...)
		hang(len(text)-len(strings.TrimLeft(text, " ")), text)
	}
	p("%s", s.title())
	p("%s", s.where())
	p("%s", strings.Repeat("=", width))
	for _, f := range s.facts() {
		hang(11, fmt.Sprintf("%-10s %s", f.name, f.text))
	}
	p("%s", strings.Repeat("-", width))
	if s.Totals.Exposures == 0 {
		p("Nothing is planned for this night.")
	} else {
		p("   #  UTC         local            LST    filter    exposure  field")
		p("      gap before  latest start        right ascension, declination  (ICRS J2000)")
		p("      alt, az, airmass and degrees from the Moon at the exposure's middle")
		p("%s", strings.Repeat("-", width))
	}
	for i := range s.Lines {
		s.lineText(&s.Lines[i], p)
	}
	p("%s", strings.Repeat("-", width))
	for _, line := range s.summary() {
		p("%s", line)
	}
	if list := s.reserve(); len(list) > 0 {
		p("")
		p("%s", reserveHead)
		for _, line := range list {
			p("%s", line)
		}
	}
	p("")
	for _, c := range s.Cautions {
		hang(2, "! "+c)
	}
	return b.Flush()
}

func (s *Sheet) lineText(l *Line, p func(string, ...any)) {
	at := fmt.Sprintf("%s  %s  %s", clock(l.Start), s.localClock(l.Start), sidereal(l.SiderealTime))
	if l.Visit == nil {
		p("  --  %s  until %s: %s", at, clock(l.End), l.Reserved)
		return
	}
	v := l.Visit
	if l.FilterBefore != "" {
		p("      >> %s", l.filterNote())
	}
	head := fmt.Sprintf("%4d  %s  %-8s %9s  ", l.Order, at, v.Filter, seconds(v.Exposure))
	name := v.Field + l.setNote()
	if utf8.RuneCountInString(head)+utf8.RuneCountInString(name) > width {
		p("%s", strings.TrimRight(head, " "))
		p("      %s", name)
	} else {
		p("%s", head+name)
	}
	p("      gap %-7s by %s %-9s %s %s", seconds(v.GapBefore), clock(l.Latest), "("+string(l.LatestBy)+")", ra(v), dec(v))
	p("      alt %.1f  az %.1f  airmass %.2f  Moon %.0f%s%s", v.Altitude, v.Azimuth, v.Airmass, v.MoonSeparation, l.moonNote(), l.stateNote())
}

// fact is one line of a sheet's head.
type fact struct{ name, text string }

func (s *Sheet) title() string {
	return fmt.Sprintf("%s: telescope %s, night of %s", s.Survey, s.Telescope, s.Night)
}

func (s *Sheet) where() string {
	const deg = 180 / math.Pi
	return fmt.Sprintf("%s, latitude %+.4f, longitude %+.4f, %.0f m; local time %s", s.Site, s.Place.Latitude*deg, s.Place.Longitude*deg, s.Place.Elevation, s.Zone)
}

// facts tells what Sun and Moon do in the night, and when the telescope is open.
func (s *Sheet) facts() []fact {
	sun := func(name string, p visibility.Passage, never, always string) fact {
		switch {
		case p.State == visibility.AlwaysAbove:
			return fact{name, never}
		case p.State == visibility.AlwaysBelow:
			return fact{name, always}
		}
		return fact{name, s.moment(p.Down) + "  to  " + s.moment(p.Up)}
	}
	out := []fact{
		sun("Sun down", s.Sky.Horizon, "the Sun does not set", "the Sun stays down"),
		sun("below -6", s.Sky.Civil, "never", "all night"),
		sun("below -12", s.Sky.Nautical, "never", "all night"),
		sun("below -18", s.Sky.Dark, "never", "all night"),
	}
	moon := fmt.Sprintf("%.0f %% lit", 100*s.Sky.Illumination)
	for _, t := range s.Sky.Moonrise {
		moon += ", rises " + s.moment(t)
	}
	for _, t := range s.Sky.Moonset {
		moon += ", sets " + s.moment(t)
	}
	out = append(out, fact{"Moon", moon})
	if s.ClockChange != 0 {
		out = append(out, fact{"clocks", fmt.Sprintf("local time goes from %s to %s at %s UTC", s.offset(s.ClockChange-1), s.offset(s.ClockChange), clock(s.ClockChange))})
	}
	if len(s.Open) == 0 {
		out = append(out, fact{"open", "not in this night"})
	}
	// Stretches of open time with reserved blocks between are told as one.
	for i := 0; i < len(s.Open); {
		k := i
		for k+1 < len(s.Open) && s.reservedFrom(s.Open[k].To) >= s.Open[k+1].From-0.01 {
			k++
		}
		out = append(out, fact{"open", s.moment(s.Open[i].From) + "  to  " + s.moment(s.Open[k].To)})
		i = k + 1
	}
	return out
}

// reservedFrom returns the end of the reserved block that starts at an instant.
func (s *Sheet) reservedFrom(unix float64) float64 {
	for i := range s.Lines {
		if l := &s.Lines[i]; l.Visit == nil && math.Abs(l.Start-unix) < 0.01 {
			return l.End
		}
	}
	return unix
}

func (s *Sheet) summary() []string {
	t := &s.Totals
	idle := max(0, t.Open-t.Exposure-t.Gaps)
	return []string{
		fmt.Sprintf("%d exposures in %d visits, %d filter changes.", t.Exposures, t.Visits, t.FilterChanges),
		fmt.Sprintf("Open %s: exposing %s, gaps %s, not planned %s.", hours(t.Open), hours(t.Exposure), hours(t.Gaps), hours(idle)),
		"'by' is the latest start after which the next exposure, a rule, the open time, the set or a later visit would suffer; up to it, all others keep their times.",
	}
}

func (l *Line) filterNote() string {
	if l.FilterBefore == firstFilter {
		return "start in filter " + l.Visit.Filter
	}
	return "FILTER " + l.FilterBefore + " -> " + l.Visit.Filter
}

func (l *Line) setNote() string {
	if l.Steps == 0 {
		return ""
	}
	return fmt.Sprintf(" [%d/%d]", l.Step, l.Steps)
}

func (l *Line) moonNote() string {
	if l.Visit.MoonAltitude <= 0 {
		return " (down)"
	}
	return ""
}

// stateNote names a state other than planned.
func (l *Line) stateNote() string {
	if l.Visit.State == "planned" {
		return ""
	}
	return "  " + l.Visit.State
}

// clock gives UTC to a tenth of a second, rounded down, so that no latest
// start shows late.
func clock(unix float64) string {
	return time.UnixMicro(int64(math.Round(unix * 1e6))).UTC().Format("15:04:05.0")
}

// localClock gives local time with its offset from UTC.
func (s *Sheet) localClock(unix float64) string { return s.local(unix).Format("15:04:05 -07:00") }

func (s *Sheet) offset(unix float64) string { return s.local(unix).Format("-07:00") }

// moment gives an instant to a minute in UTC and local time.
func (s *Sheet) moment(unix float64) string {
	if math.IsNaN(unix) {
		return "-"
	}
	t := math.Round(unix/60) * 60
	return time.Unix(int64(t), 0).UTC().Format("15:04") + " UTC (" + s.local(t).Format("15:04 -07:00") + ")"
}

func sidereal(rad float64) string {
	return visibility.FormatHours(rad, 0)[:5]
}

func seconds(x float64) string { return tables.Float(math.Round(x*10)/10) + " s" }

func hours(sec float64) string {
	m := int(math.Round(sec / 60))
	return fmt.Sprintf("%d h %02d m", m/60, m%60)
}

func ra(v *tables.VisitRow) string { return visibility.FormatHours(v.RA*math.Pi/180, 2) }

func dec(v *tables.VisitRow) string { return visibility.FormatDegrees(v.Dec*math.Pi/180, 1) }

// wrap breaks a text at spaces into lines of at most n characters; lines after
// the first are indented. A longer word is cut.
func wrap(text string, n, indent int) []string {
	var out []string
	runes := []rune(text)
	for start := len(text) - len(strings.TrimLeft(text, " ")); len(runes) > n; start = indent {
		cut := n
		for k := n; k > start; k-- {
			if runes[k] == ' ' {
				cut = k
				break
			}
		}
		out = append(out, strings.TrimRight(string(runes[:cut]), " "))
		runes = []rune(strings.Repeat(" ", indent) + strings.TrimLeft(string(runes[cut:]), " "))
	}
	return append(out, string(runes))
}
