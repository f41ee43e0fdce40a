package sheet

import (
	"encoding/csv"
	"fmt"
	"io"
	"math"
	"strconv"
	"time"

	"nightwright/scheduler/tables"
	"nightwright/visibility"
)

// csvColumns are the columns of WriteCSV. In a line of a reserved block all
// after note are empty.
var csvColumns = []string{
	"kind", "start_utc", "end_utc", "start_local", "sidereal_time", "note",
	"order", "visit", "set", "set_step", "field", "program", "demand", "ra", "dec", "ra_deg", "dec_deg", "filter", "filter_change", "exposure_s",
	"altitude_deg", "azimuth_deg", "airmass", "moon_altitude_deg", "moon_separation_deg", "gap_before_s", "latest_start_utc", "latest_by", "state",
}

// WriteCSV writes the sheet's lines as CSV: instants in RFC 3339, local ones
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
	c.Flush()
	if err := c.Error(); err != nil {
		return fmt.Errorf("sheet: %w", err)
	}
	return nil
}

func (s *Sheet) record(l *Line) []string {
	out := make([]string, len(csvColumns))
	instant := func(unix float64) string { return tables.Instant(int64(math.Round(unix * 1e6))) }
	local := s.local(l.Start).Format(time.RFC3339Nano)
	common := []string{"reserved", instant(l.Start), instant(l.End), local, visibility.FormatHours(l.SiderealTime, 1), l.Reserved}
	v := l.Visit
	if v == nil {
		copy(out, common)
		return out
	}
	common[0] = "exposure"
	set, step := "", ""
	if v.Set != 0 {
		set, step = strconv.FormatInt(v.Set, 10), strconv.Itoa(l.Step)
	}
	change := ""
	if l.FilterBefore != "" && l.FilterBefore != firstFilter {
		change = l.FilterBefore + ">" + v.Filter
	}
	copy(out, append(common,
		strconv.Itoa(l.Order), strconv.FormatInt(v.Visit, 10), set, step, v.Field, v.Program, v.Demand,
		ra(v), dec(v), tables.Float(v.RA), tables.Float(v.Dec), v.Filter, change, tables.Float(v.Exposure),
		tables.Float(v.Altitude), tables.Float(v.Azimuth), tables.Float(v.Airmass), tables.Float(v.MoonAltitude), tables.Float(v.MoonSeparation),
		tables.Float(v.GapBefore), instant(l.Latest), string(l.LatestBy), v.State,
	))
	return out
}
