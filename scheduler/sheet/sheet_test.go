package sheet

import (
	"strings"
	"testing"
	"time"

	"nightwright/constraints/survey"
	"nightwright/scheduler/tables"
)

// exposures drops the reserved blocks of a sheet.
func exposures(s *Sheet) []Line {
	var out []Line
	for _, l := range s.Lines {
		if l.Visit != nil {
			out = append(out, l)
		}
	}
	return out
}

func TestLinesInOrder(t *testing.T) {
	s := busy(t).sheet(t, "C1", 0)
	x := exposures(s)
	if len(x) != 6 {
		t.Fatalf("%d exposures; want 6", len(x))
	}
	for i, l := range x {
		if l.Order != i+1 || i > 0 && l.Start < x[i-1].End {
			t.Errorf("line %d: order %d at %g", i, l.Order, l.Start)
		}
	}
	var changes, steps []string
	for _, l := range x {
		changes = append(changes, l.FilterBefore)
		steps = append(steps, l.setNote())
	}
	if got := strings.Join(changes, "|"); got != "-|||g||" {
		t.Errorf("filter changes %q; want the first filter, and from g once", got)
	}
	if got := strings.Join(steps, "|"); got != "|| [1/2]| [2/2]||" {
		t.Errorf("set steps %q", got)
	}
	if s.Totals.Exposures != 6 || s.Totals.Visits != 5 || s.Totals.FilterChanges != 1 || s.Totals.Exposure != 60+60+60+45+90+90 {
		t.Errorf("totals %+v", s.Totals)
	}
}

// TestReservedBlocksStandInTheirPlaces: the night opens with standards, has
// focus every two hours from then on, and closes with flats.
func TestReservedBlocksStandInTheirPlaces(t *testing.T) {
	f := busy(t)
	s := f.sheet(t, "C1", 0)
	var blocks []Line
	for i, l := range s.Lines {
		if i > 0 && l.Start < s.Lines[i-1].Start {
			t.Errorf("line %d is out of order", i)
		}
		if l.Visit == nil {
			blocks = append(blocks, l)
		}
	}
	first, last := blocks[0], blocks[len(blocks)-1]
	if first.Reserved != "standards" || first.End-first.Start != 900 || last.Reserved != "flats" {
		t.Errorf("blocks %+v", blocks)
	}
	for k, l := range blocks[1 : len(blocks)-1] {
		if l.Reserved != "focus" || l.Start-first.Start != float64(k+1)*7200 || l.End-l.Start != 180 {
			t.Errorf("block %d: %+v; want focus, 3 min, %d h after the opening", k+1, l, 2*(k+1))
		}
	}
	if len(blocks) < 5 {
		t.Errorf("%d blocks; want at least 5 in a March night", len(blocks))
	}
	if b := f.sheet(t, "C2", 0); len(b.Lines) != 1 {
		t.Errorf("%d lines on the telescope without reserves; want 1", len(b.Lines))
	}
}

// TestSiderealTime: local sidereal time at Greenwich mean 0 h of 2027-03-10 is
// about the right ascension of the mean Sun + 12 h, 11 h 08 m (common practice:
// 12 h at the September equinox, 4 min a day); at -106.8 deg it is 7 h 07 m
// less, and sidereal time runs 1.00274 as fast.
func TestSiderealTime(t *testing.T) {
	x := exposures(busy(t).sheet(t, "C1", 0))[0]
	want := 11.14 - 106.8/15 + 4*1.00274
	if got := x.SiderealTime / deg / 15; got < want-0.05 || got > want+0.05 {
		t.Errorf("sidereal time %.3f h; want about %.3f", got, want)
	}
}

func TestBuildRefuses(t *testing.T) {
	f := busy(t)
	pt := f.tables(t)
	night := f.sv.FirstNight
	tests := []struct {
		ask  Ask
		want string
	}{
		{Ask{Telescope: "C9", Night: night}, `there is no telescope "C9"; want one of C1, C2`},
		{Ask{Telescope: "C1", Night: night - 1}, "outside the survey's period; want 2027-03-09 to 2027-03-10"},
		{Ask{Telescope: "C1", Night: night + 2}, "outside the survey's period"},
	}
	for _, tt := range tests {
		if _, err := Build(f.sv, f.exact, f.cal, pt, tt.ask); err == nil || !strings.Contains(err.Error(), tt.want) {
			t.Errorf("%+v: %v; want %q", tt.ask, err, tt.want)
		}
	}
	for _, spoil := range []func(*tables.VisitRow){func(r *tables.VisitRow) { r.Field = "X" }, func(r *tables.VisitRow) { r.Demand = "X" }} {
		bad := *pt
		bad.Visits = append([]tables.VisitRow{}, pt.Visits...)
		spoil(&bad.Visits[0])
		if _, err := Build(f.sv, f.exact, f.cal, &bad, Ask{Telescope: "C1", Night: night}); err == nil || !strings.Contains(err.Error(), "want the survey that the plan was made for") {
			t.Errorf("a plan of another survey: %v", err)
		}
	}
	s, err := Build(f.sv, f.exact, f.cal, pt, Ask{Telescope: "C1", Night: night + 1})
	if err != nil || s.Zone != time.UTC || s.Totals.Exposures != 0 {
		t.Errorf("an empty night: %v", err)
	}
}

// TestClocksChange: clocks in the mountain zone of North America go forward on
// 2027-03-14 at 02:00 local standard time, 09:00 UTC (the second Sunday of
// March; US Energy Policy Act of 2005).
func TestClocksChange(t *testing.T) {
	sv := oneSite()
	sv.FirstNight, _ = survey.ParseDay("2027-03-13")
	sv.LastNight = sv.FirstNight + 1
	f := prepare(t, sv)
	four := 4 * 86400.0 // from the helper's date to this one
	f.add(2, 0, 0, 0, at(8, 50, 0)+four, 0)
	f.add(2, 1, 0, 0, at(9, 10, 0)+four, 0)
	s := f.sheet(t, "C1", 0)
	if want := at(9, 0, 0) + four; s.ClockChange != want {
		t.Fatalf("clocks change at %g; want %g", s.ClockChange, want)
	}
	x := exposures(s)
	if got := s.localClock(x[0].Start) + " " + s.localClock(x[1].Start); got != "01:50:00 -07:00 03:10:00 -06:00" {
		t.Errorf("local times %s; want each with its own offset", got)
	}
	var b strings.Builder
	if err := s.WriteText(&b); err != nil || !strings.Contains(b.String(), "from -07:00 to -06:00 at 09:00:00.0 UTC") || !strings.Contains(b.String(), "work by UTC") {
		t.Errorf("%v\n%s", err, b.String())
	}
	if s := f.sheet(t, "C1", 1); s.ClockChange != 0 {
		t.Errorf("clocks change again the night after, at %g", s.ClockChange)
	}
}
