package sheet

import (
	_ "embed"
	"fmt"
	"html/template"
	"io"
	"math"
	"strings"

	"nightwright/visibility"
)

//go:embed sheet.html.tmpl
var htmlText string

var page = template.Must(template.New("sheet").Parse(htmlText))

// htmlLine is a line as the page shows it.
type htmlLine struct {
	Reserved, Filter              string
	Order                         int
	UTC, Local, Sidereal, End     string
	Field, Note, RA, Dec          string
	InFilter, Exposure, Gap       string
	Altitude, Azimuth, Airmass    string
	Moon, Latest, LatestBy, State string
}

// WriteHTML writes the sheet as one self-contained page to print: nothing is
// fetched, and there are no scripts.
func (s *Sheet) WriteHTML(w io.Writer) error {
	type head struct{ Name, Text string }
	data := struct {
		Title, Where  string
		Facts         []head
		Lines         []htmlLine
		Notes, Advice []string
		ReserveHead   string
		Reserve       []htmlSpare
	}{Title: s.title(), Where: s.where(), Notes: s.summary(), Advice: s.Cautions, ReserveHead: reserveHead, Reserve: s.htmlReserve()}
	for _, f := range s.facts() {
		data.Facts = append(data.Facts, head{f.name, f.text})
	}
	for i := range s.Lines {
		data.Lines = append(data.Lines, s.htmlLine(&s.Lines[i]))
	}
	if err := page.Execute(w, data); err != nil {
		return fmt.Errorf("sheet: %w", err)
	}
	return nil
}

// htmlSpare is a line of the reserve list as the page shows it.
type htmlSpare struct{ Field, Demand, What, From, To, Best, PerHour, RA, Dec string }

func (s *Sheet) htmlReserve() []htmlSpare {
	var out []htmlSpare
	for i := range s.Reserve {
		x := &s.Reserve[i]
		what := x.Filter + " " + seconds(x.Exposure)
		if x.Exposures > 1 {
			what = fmt.Sprintf("set of %d from %s", x.Exposures, what)
		}
		out = append(out, htmlSpare{
			x.Field, x.Demand, what, clock(x.From)[:5], clock(x.To)[:5], clock(x.Best)[:5], fmt.Sprintf("%.0f", 1e6*x.PerHour),
			visibility.FormatHours(x.RA*math.Pi/180, 2), visibility.FormatDegrees(x.Dec*math.Pi/180, 1),
		})
	}
	return out
}

func (s *Sheet) htmlLine(l *Line) htmlLine {
	h := htmlLine{UTC: clock(l.Start), End: clock(l.End), Local: s.localClock(l.Start), Sidereal: sidereal(l.SiderealTime), Reserved: l.Reserved}
	v := l.Visit
	if v == nil {
		return h
	}
	if l.FilterBefore != "" {
		h.Filter = l.filterNote()
	}
	h.Order, h.Field, h.Note, h.RA, h.Dec = l.Order, v.Field, strings.TrimSpace(l.setNote()), ra(v), dec(v)
	h.InFilter, h.Exposure, h.Gap = v.Filter, seconds(v.Exposure), seconds(v.GapBefore)
	h.Altitude, h.Azimuth, h.Airmass = fmt.Sprintf("%.1f", v.Altitude), fmt.Sprintf("%.1f", v.Azimuth), fmt.Sprintf("%.2f", v.Airmass)
	h.Moon = fmt.Sprintf("%.0f%s", v.MoonSeparation, l.moonNote())
	h.Latest, h.LatestBy, h.State = clock(l.Latest), string(l.LatestBy), strings.TrimSpace(l.stateNote())
	return h
}
