package ledger

import (
	"fmt"
	"math"
	"strings"
	"testing"

	"nightwright/constraints/survey"
	"nightwright/visibility"
)

// credit records a text and works out what it is worth.
func (b *bench) credit(text string) *Credits {
	b.Helper()
	b.must(text)
	return Credit(b.sv, b.exact, b.done())
}

func (b *bench) field(name string) int {
	b.Helper()
	for i := range b.sv.Fields {
		if b.sv.Fields[i].Name == name {
			return i
		}
	}
	b.Fatalf("no field %s", name)
	return 0
}

func TestTheTelescopesQualityWins(t *testing.T) {
	b := newBench(t)
	c := b.credit(head + "A1,C1,r,2027-03-09T04:00:00Z,2027-03-09T04:05:00Z,0.31\nA2,C1,r,2027-03-09T05:00:00Z,2027-03-09T05:05:00Z,\n")
	if n, q := c.Got(b.field("A1"), 0); n != 1 || q != 0.31 {
		t.Errorf("A1: %d visits of quality %g; want the telescope's 0.31", n, q)
	}
	// The computed one is the quality formula on the exact path, at the middle.
	a2 := b.field("A2")
	at := b.exact.At(t0400/1e6 + 3600 + 150)
	place := placeOf(b, 0)
	f := &b.sv.Fields[a2]
	star, sun, moon := at.Star(place, visibility.Position{RA: f.RA, Dec: f.Dec}), at.Sun(place), at.Moon(place)
	want := visibility.Quality(b.sv.Filters[1], visibility.Geometry{SinAltitude: math.Sin(star.Altitude), SunAltitude: sun.Altitude, MoonAltitude: moon.Altitude, MoonSeparation: visibility.Separation(star, moon.Horizontal), MoonPhaseAngle: moon.PhaseAngle})
	if n, q := c.Got(a2, 0); n != 1 || math.Abs(q-want) > 1e-12 || q < 0.5 {
		t.Errorf("A2: %d visits of quality %g; want %g", n, q, want)
	}
}

func TestAnExposureCutShortIsWorthItsPart(t *testing.T) {
	b := newBench(t)
	// The same middle, 300 s and 120 s long.
	whole := b.credit(head+"A2,C1,r,2027-03-09T05:00:00Z,2027-03-09T05:05:00Z,\n").Of(b.field("A2"), 0)[0].Quality
	b = newBench(t)
	part := b.credit(head+"A2,C1,r,2027-03-09T05:01:30Z,2027-03-09T05:03:30Z,\n").Of(b.field("A2"), 0)[0].Quality
	if math.Abs(part-0.4*whole) > 1e-12 {
		t.Errorf("120 s of 300 s: quality %g; want 0.4 x %g", part, whole)
	}
}

func TestBelowMinQualityCountsForNothingAndStays(t *testing.T) {
	b := newBench(t)
	b.sv.Fields[0].Rules[0].MinQuality = 0.3
	c := b.credit(head + "A1,C1,r,2027-03-09T04:00:00Z,2027-03-09T04:05:00Z,0.29\nA1,C1,r,2027-03-10T04:00:00Z,2027-03-10T04:05:00Z,0.3\nA1,C1,r,2027-03-11T04:00:00Z,2027-03-11T04:05:00Z,0.1\n")
	n, q := c.Got(0, 0)
	last, ok := c.Last(0, 0)
	if n != 1 || q != 0.3 || !ok || last != t0400+86400e6 {
		t.Errorf("%d visits of %g, the last sound one at %s, %v; want the one of 0.3", n, q, Instant(last), ok)
	}
	if len(c.Of(0, 0)) != 3 || len(b.done()) != 3 {
		t.Error("visits below min_quality are gone from the record")
	}
	if _, ok := c.Last(1, 0); ok {
		t.Error("a last visit of a field without any")
	}
}

func TestMoreThanWantedIsSurplus(t *testing.T) {
	b := newBench(t)
	var text strings.Builder
	text.WriteString(head)
	for d := range 5 { // from two days before the period on: these carry over
		fmt.Fprintf(&text, "A1,C1,r,2027-03-%02dT04:00:00Z,2027-03-%02dT04:05:00Z,0.%d\n", 7+d, 7+d, 5+d)
	}
	c := b.credit(text.String())
	n, q := c.Got(0, 0)
	if last, _ := c.Last(0, 0); n != 3 || math.Abs(q-(0.5+0.6+0.7)) > 1e-12 || last != t0400+2*86400e6 {
		t.Errorf("%d visits of %g, last %s; want the first 3, and the last of all", n, q, Instant(last))
	}
	if night := c.Of(0, 0)[0].Night; night != b.sv.FirstNight-2 {
		t.Errorf("the first is of night %s", night)
	}
}

func TestSets(t *testing.T) {
	b := newBench(t)
	const h = "field,telescope,filter,start_utc,end_utc,quality,set\n"
	row := func(field, filter, clock, quality string, set int) string {
		return fmt.Sprintf("%s,C1,%s,2027-03-09T%s:00Z,2027-03-09T%s:50Z,%s,%d\n", field, filter, clock, clock, quality, set)
	}
	c := b.credit(h +
		row("B1", "g", "04:00", "0.4", 1) + row("B1", "r", "04:10", "0.6", 1) + // whole
		row("B2", "g", "05:00", "0.4", 2) + // half
		row("B2", "r", "05:30", "0.4", 3) + row("B2", "g", "05:40", "0.4", 3) + // the wrong way round
		row("B3", "g", "06:00", "0.9", 4) + row("B3", "r", "06:10", "0.9", 5)) // two halves
	b1 := c.Of(b.field("B1"), 0)
	if len(b1) != 1 || !b1[0].Counts || b1[0].Quality != 0.5 || len(b1[0].Exposures) != 2 || b1[0].End != t0400+650e6 {
		t.Errorf("B1: %+v; want one whole visit of 0.5", b1)
	}
	for _, name := range []string{"B2", "B3"} {
		list := c.Of(b.field(name), 0)
		if len(list) != 2 {
			t.Errorf("%s: %d visits; want 2 broken ones", name, len(list))
		}
		for _, v := range list {
			if v.Whole || v.Sound || v.Counts {
				t.Errorf("%s: %+v; want it broken", name, v)
			}
		}
		if n, _ := c.Got(b.field(name), 0); n != 0 {
			t.Errorf("%s: %d visits count", name, n)
		}
	}
	_, faults := b.record(head+line("B1", "C1", "g", "08:00"), false)
	if len(faults) != 1 {
		t.Errorf("half a set without its number: %v", faults)
	}
}

func TestStrangersAfterTheSurveyChanged(t *testing.T) {
	b := newBench(t)
	b.must(head + line("A1", "C1", "r", "04:00") + line("A2", "C1", "r", "04:10") + line("A3", "S1", "r", "04:20"))
	done := b.done()
	b.sv.Fields[0].Name = "renamed"
	b.sv.Telescopes[1].Name = "T9"
	b.sv.Programs[0].Demands = append(b.sv.Programs[0].Demands, survey.Demand{Name: "new", Visits: 1, Exposures: b.sv.Programs[0].Demands[0].Exposures})
	for i := range b.sv.Fields {
		if b.sv.Fields[i].Program == 0 {
			b.sv.Fields[i].Rules = append(b.sv.Fields[i].Rules, b.sv.Fields[i].Rules[0])
		}
	}
	c := Credit(b.sv, b.exact, done)
	if len(c.Strangers) != 1 || c.Strangers[0] != 0 || !math.IsNaN(c.Qualities[0]) {
		t.Errorf("strangers %v; want the exposure of the field that is gone", c.Strangers)
	}
	if n, _ := c.Got(1, 0); n != 1 {
		t.Error("A2's visit is lost")
	}
	if n, _ := c.Got(1, 1); n != 0 {
		t.Error("the new demand has a visit")
	}
	// Of a telescope that is gone: no place, no computed quality.
	if v := c.Of(2, 0); len(v) != 1 || v[0].Telescope != -1 || v[0].Quality != 0 {
		t.Errorf("A3: %+v", v)
	}
}

func TestFollow(t *testing.T) {
	b := newBench(t)
	b.must("kind,site," + head[:len(head)-1] + ",cause\n" +
		"done,,A1,C1,r,2027-03-09T04:00:00Z,2027-03-09T04:05:00Z,0.5,\n" +
		"done,,A2,C1,r,2027-03-09T05:00:00Z,2027-03-09T05:05:00Z,0.01,\n" +
		"done,,A3,C1,r,2027-03-20T05:00:00Z,2027-03-20T05:05:00Z,0.9,\n" + // after the instant asked for
		"lost,Salt Mesa,,,,2027-03-09T02:00:00Z,2027-03-09T04:00:00Z,,weather\n")
	l := b.open()
	defer l.Close()
	rows, err := l.LossRows(t.Context(), Now)
	if err != nil {
		t.Fatal(err)
	}
	for f := range b.sv.Fields {
		for d := range b.sv.Fields[f].Rules {
			b.sv.Fields[f].Rules[d].MinQuality = 0.1
		}
	}
	done := b.done()
	open := func(telescope, night int) []visibility.Interval {
		from := t0400/1e6 - 3*3600 + float64(night)*86400 // 01:00 to 09:00
		return []visibility.Interval{{From: from, To: from + 8*3600}}
	}
	planned := []Planned{
		{Program: "wide", Site: "Cinder Ridge", Telescope: "C1", Night: 20885, Start: t0400, Credit: 0.05},
		{Program: "wide", Site: "Salt Mesa", Telescope: "S1", Night: 20885, Start: t0400 - 3600e6, Credit: 0.05}, // lost
		{Program: "pairs", Site: "Salt Mesa", Telescope: "S1", Night: 20885, Start: t0400, Set: 7, Credit: 0.01},
		{Program: "pairs", Site: "Salt Mesa", Telescope: "S1", Night: 20885, Start: t0400 + 600e6, Set: 7, Credit: 0.01},
		{Program: "wide", Site: "Cinder Ridge", Telescope: "C1", Night: 20886, Start: t0400 + 86400e6, Credit: 0.05}, // later
	}
	tr := Follow(Holdings{Survey: b.sv, Done: done, Credits: Credit(b.sv, b.exact, done), Lost: LostTime(b.sv, rows), Open: open, Planned: planned}, t0400+6*3600e6)
	// wide weighs 5 x 1, pairs 3 x 2: A1's visit is 1/11 x 0.5 / 3 of coverage.
	want := Tally{Planned: 3, Done: 1, PlannedCredit: 0.12, DoneCredit: 0.5 / 33}
	near := func(a, b Tally) bool {
		return a.Planned == b.Planned && a.Done == b.Done && math.Abs(a.PlannedCredit-b.PlannedCredit) < 1e-12 && math.Abs(a.DoneCredit-b.DoneCredit) < 1e-12
	}
	if !near(tr.All, want) || tr.All.Behind() != 2 || tr.Wanted != 18 || tr.Below != 1 {
		t.Errorf("all: %+v, wanted %d, below %d", tr.All, tr.Wanted, tr.Below)
	}
	if !near(tr.Programs[1].Tally, Tally{Planned: 1, PlannedCredit: 0.02}) || tr.Programs[1].Wanted != 3 {
		t.Errorf("pairs: %+v", tr.Programs[1])
	}
	s1 := tr.Places[1]
	if s1.OpenHours != 8 || s1.Lost[0] != (LostCause{"weather", 2, 1}) || s1.Planned != 2 {
		t.Errorf("S1: %+v; want 2 h of 8 lost to weather with one planned visit", s1)
	}
	if len(tr.Nights) != 1 || tr.Nights[0] != (NightTrack{20885, "2027-03-08", 3, 1, 16, 2}) {
		t.Errorf("nights: %+v", tr.Nights)
	}
}
