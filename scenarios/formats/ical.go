package formats

import (
	"bufio"
	"cmp"
	"fmt"
	"io"
	"math"
	"slices"
	"strings"
	"time"
	"unicode/utf8"

	"nightwright/scheduler/tables"
)

// WriteCalendar writes an event for each telescope and night that has
// exposures, from the start of the first (whole seconds, downwards) to the
// end of the last (upwards), as iCalendar. DTSTAMP is the plan's stamp. The
// UID of a night stays the same through re-plans, so that a calendar program
// replaces what it has.
func WriteCalendar(w io.Writer, p Plan) error {
	rows := append([]tables.VisitRow(nil), p.Tables.Visits...)
	slices.SortStableFunc(rows, func(a, b tables.VisitRow) int {
		return cmp.Or(cmp.Compare(a.Night, b.Night), cmp.Compare(a.Telescope, b.Telescope), cmp.Compare(a.Start, b.Start))
	})
	type key struct {
		night     int32
		telescope string
	}
	nights := map[key]*tables.NightRow{}
	for i := range p.Tables.Nights {
		n := &p.Tables.Nights[i]
		nights[key{n.Night, n.Telescope}] = n
	}
	c := calendar{b: bufio.NewWriterSize(w, 1<<16)}
	c.line("BEGIN", "VCALENDAR")
	c.line("VERSION", "2.0")
	c.line("PRODID", "-//nightwright//telescope nights//EN")
	c.line("CALSCALE", "GREGORIAN")
	c.line("X-WR-CALNAME", escaped(p.Tables.Summary.Survey))
	for from := 0; from < len(rows); {
		to := from
		for to < len(rows) && rows[to].Night == rows[from].Night && rows[to].Telescope == rows[from].Telescope {
			to++
		}
		c.night(p, rows[from:to], nights[key{rows[from].Night, rows[from].Telescope}])
		from = to
	}
	c.line("END", "VCALENDAR")
	return c.b.Flush()
}

type calendar struct{ b *bufio.Writer }

// night writes one event.
func (c *calendar) night(p Plan, visits []tables.VisitRow, n *tables.NightRow) {
	first := &visits[0]
	end, exposure, done := first.End, 0.0, 0
	fields, programs := map[string]bool{}, []string{}
	for i := range visits {
		v := &visits[i]
		end = max(end, v.End)
		exposure += v.Exposure
		fields[v.Field] = true
		if v.State == "done" {
			done++
		}
		if !slices.Contains(programs, v.Program) {
			programs = append(programs, v.Program)
		}
	}
	slices.Sort(programs)
	status := "TENTATIVE"
	if done == len(visits) {
		status = "CONFIRMED"
	}
	c.line("BEGIN", "VEVENT")
	c.line("UID", escaped(fmt.Sprintf("%s-%s-%s@nightwright", slug(p.Tables.Summary.Survey), slug(first.Telescope), tables.Date(first.Night))))
	c.line("DTSTAMP", utc(p.Stamp/1e6))
	c.line("DTSTART", utc(int64(math.Floor(float64(first.Start)/1e6))))
	c.line("DTEND", utc(int64(math.Ceil(float64(end)/1e6))))
	c.line("SUMMARY", escaped(fmt.Sprintf("%s: %d exposures of %d fields", first.Telescope, len(visits), len(fields))))
	about := fmt.Sprintf("Night %s at %s, telescope %s.\nExposures: %d, %.1f h; done: %d.\nPrograms: %s.",
		tables.Date(first.Night), first.Site, first.Telescope, len(visits), exposure/3600, done, strings.Join(programs, ", "))
	if n != nil {
		about += fmt.Sprintf("\nOpen %.1f h, used %.1f h; Moon %.0f %%.", n.OpenHours, n.UsedHours, 100*n.MoonIllumination)
	}
	c.line("DESCRIPTION", escaped(about))
	c.line("LOCATION", escaped(first.Site))
	for i := range p.Survey.Sites {
		if s := &p.Survey.Sites[i]; s.Name == first.Site {
			lon := math.Remainder(s.Longitude, 2*math.Pi)
			c.line("GEO", fmt.Sprintf("%.6f;%.6f", degrees(s.Latitude), degrees(lon)))
		}
	}
	c.line("STATUS", status)
	c.line("END", "VEVENT")
}

func utc(seconds int64) string { return time.Unix(seconds, 0).UTC().Format("20060102T150405Z") }

// slug makes a name fit for a UID: ASCII letters and digits stay, a blank
// becomes a dash, and any other sign its number.
func slug(s string) string {
	var b strings.Builder
	for _, r := range s {
		switch {
		case r >= '0' && r <= '9', r >= 'a' && r <= 'z', r >= 'A' && r <= 'Z', r == '.', r == '_':
			b.WriteRune(r)
		case r == ' ':
			b.WriteByte('-')
		default:
			fmt.Fprintf(&b, "+%x.", r)
		}
	}
	return b.String()
}

var textEscapes = strings.NewReplacer(`\`, `\\`, ";", `\;`, ",", `\,`, "\r\n", `\n`, "\n", `\n`, "\r", `\n`)

// escaped writes a text value (RFC 5545, 3.3.11).
func escaped(s string) string { return textEscapes.Replace(s) }

// line writes a content line, folded after at most 75 octets (RFC 5545, 3.1)
// and never inside a character.
func (c *calendar) line(name, value string) {
	text := name + ":" + value
	most := 75
	for len(text) > most {
		cut := most
		for cut > 1 && !utf8.RuneStart(text[cut]) {
			cut--
		}
		c.b.WriteString(text[:cut])
		c.b.WriteString("\r\n ")
		text, most = text[cut:], 74 // the blank counts
	}
	c.b.WriteString(text)
	c.b.WriteString("\r\n")
}
