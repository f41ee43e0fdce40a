package sheet

import (
	"encoding/csv"
	"fmt"
	"io"
	"math"
	"slices"
	"strconv"
	"time"

	"nightwright/scheduler/tables"
	"nightwright/visibility"
)

// csvColumns are the columns of WriteCSV. The first are those of a file for the
// ledger: with done in place of planned a sheet is one.
var csvColumns = []string{
	"kind", "telescope", "site", "field", "demand", "filter", "start_utc", "end_utc", "quality", "cause", "note",
	"start_local", "sidereal_time", "order", "visit", "set", "set_step", "program", "ra", "dec", "ra_deg", "dec_deg", "filter_change", "exposure_s",
	"altitude_deg", "azimuth_deg", "airmass", "moon_altitude_deg", "moon_separation_deg", "gap_before_s", "latest_start_utc", "latest_by",
}

// WriteCSV writes the sheet's lines as CSV that the ledger takes back: instants in RFC 3339, local ones
// with their offset, numbers unrounded.
func (s *Sheet) WriteCSV(w io.Writer) error {
	c := csv.NewWriter(w)
	if err := c.Write(csvColumns); err != nil {
		return fmt.Errorf("sheet: %w", err)
	}
	for i := range s.Lines {
		if err := c.Write(s.record(&s.Lines[i])); err != nil {
			return fmt.Errorf("sheet: %w", err)
		}
	}
	for i := range s.Reserve {
		if err := c.Write(s.spareRecord(&s.Reserve[i])); err != nil {
			return fmt.Errorf("sheet: %w", err)
		}
	}
	c.Flush()
	if err := c.Error(); err != nil {
		return fmt.Errorf("sheet: %w", err)
	}
	return nil
}

// spareRecord is a line of the reserve list: without times, which whoever takes it
// fills in.
func (s *Sheet) spareRecord(x *Spare) []string {
	out := make([]string, len(csvColumns))
	set := func(column, text string) { out[slices.Index(csvColumns, column)] = text }
	instant := func(unix float64) string { return tables.Instant(int64(math.Round(unix * 1e6))) }
	set("kind", "reserve")
	set("telescope", s.Telescope)
	set("site", s.Site)
	set("field", x.Field)
	set("demand", x.Demand)
	set("filter", x.Filter)
	set("program", x.Program)
	set("note", fmt.Sprintf("start from %s to %s, best %s", instant(x.From), instant(x.To), instant(x.Best)))
	set("ra_deg", tables.Float(x.RA))
	set("dec_deg", tables.Float(x.Dec))
	set("exposure_s", tables.Float(x.Exposure))
	return out
}

func (s *Sheet) record(l *Line) []string {
	instant := func(unix float64) string { return tables.Instant(int64(math.Round(unix * 1e6))) }
	local := s.local(l.Start).Format(time.RFC3339Nano)
	lst := visibility.FormatHours(l.SiderealTime, 1)
	v := l.Visit
	if v == nil {
		out := []string{"reserved", s.Telescope, s.Site, "", "", "", instant(l.Start), instant(l.End), "", "", l.Reserved, local, lst}
		return append(out, make([]string, len(csvColumns)-len(out))...)
	}
	kind := v.State
	if kind == "done" {
		kind = "recorded" // it stands in the ledger already
	}
	set, step := "", ""
	if v.Set != 0 {
		set, step = strconv.FormatInt(v.Set, 10), strconv.Itoa(l.Step)
	}
	change := ""
	if l.FilterBefore != "" && l.FilterBefore != firstFilter {
		change = l.FilterBefore + ">" + v.Filter
	}
	return []string{
		kind, s.Telescope, s.Site, v.Field, v.Demand, v.Filter, instant(l.Start), instant(l.End), "", "", "",
		local, lst, strconv.Itoa(l.Order), strconv.FormatInt(v.Visit, 10), set, step, v.Program,
		ra(v), dec(v), tables.Float(v.RA), tables.Float(v.Dec), change, tables.Float(v.Exposure),
		tables.Float(v.Altitude), tables.Float(v.Azimuth), tables.Float(v.Airmass), tables.Float(v.MoonAltitude), tables.Float(v.MoonSeparation),
		tables.Float(v.GapBefore), instant(l.Latest), string(l.LatestBy),
	}
}
