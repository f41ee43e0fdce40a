package ledger

import (
	"fmt"
	"math"
	"strings"
	"testing"
	"time"

	"github.com/google/go-cmp/cmp"
)

// line is one row of exposures under head.
func line(field, telescope, filter, clock string) string {
	return fmt.Sprintf("%s,%s,%s,2027-03-09T%s:00Z,2027-03-09T%s:20Z,\n", field, telescope, filter, clock, clock)
}

func TestRecordKeepsWhatWasDone(t *testing.T) {
	b := newBench(t)
	res := b.must(head + "A1,C1,r,2027-03-09T04:00:00Z,2027-03-09T04:05:00Z,0.5\nA2,C1,,2027-03-09T04:06:00Z,2027-03-09T04:11:00.25Z,\n")
	if res.Entry != 1 || res.Done != 2 || res.FirstStart != t0400 {
		t.Errorf("%+v", res)
	}
	want := []Exposure{
		{ID: 1, Source: "night.csv", Row: 2, Field: "A1", Program: "wide", Demand: "r", Filter: "r", Site: "Cinder Ridge", Telescope: "C1", Night: 20885, Start: t0400, End: t0405, Quality: 0.5},
		{ID: 2, Source: "night.csv", Row: 3, Field: "A2", Program: "wide", Demand: "r", Filter: "r", Site: "Cinder Ridge", Telescope: "C1", Night: 20885, Start: t0400 + 360e6, End: t0400 + 660.25e6, Quality: -1},
	}
	got := b.done()
	if !math.IsNaN(got[1].Quality) {
		t.Errorf("no quality was given, and it is %g", got[1].Quality)
	}
	got[1].Quality = -1
	if d := cmp.Diff(want, got); d != "" {
		t.Error(d)
	}
	b.sound()
}

func TestASeenRowChangesNothing(t *testing.T) {
	b := newBench(t)
	text := "kind,site," + head[:len(head)-1] + ",cause\ndone,,A1,C1,r,2027-03-09T04:00:00Z,2027-03-09T04:05:00Z,0.5,\nlost,Salt Mesa,,,,2027-03-09T04:00:00Z,2027-03-09T04:05:00Z,,weather\n"
	if res := b.must(text); res.Done != 1 || res.Lost != 1 || res.Seen != 0 {
		t.Fatalf("%+v", res)
	}
	if res := b.must(text); res.Entry != 0 || res.Seen != 2 || res.Done+res.Lost != 0 {
		t.Errorf("again: %+v; want nothing new", res)
	}
	// One new row beside an old one, and itself twice.
	row := "done,,A2,C1,r,2027-03-09T05:00:00Z,2027-03-09T05:05:00Z,,\n"
	if res := b.must(text + row + row); res.Entry != 2 || res.Done != 1 || res.Seen != 3 {
		t.Errorf("with a new row: %+v", res)
	}
	if n := len(b.done()); n != 2 {
		t.Errorf("%d exposures; want 2", n)
	}
	b.sound()
}

func TestFaultsRefuseTheWholeFile(t *testing.T) {
	b := newBench(t)
	b.must(head + line("A1", "C1", "r", "04:00"))
	text := head +
		line("A2", "C1", "r", "05:00") + // good
		line("A9", "C1", "r", "05:10") +
		line("a3", "C1", "r", "05:20") +
		line("A3", "C1", "g", "05:30") +
		line("A3", "C9", "r", "05:40") +
		line("A3", "C1", "z", "05:50") +
		line("B1", "C1", "g", "06:00") +
		"A3,C1,r,2027-03-09T04:00:10Z,2027-03-09T04:00:30Z,\n" +
		line("A3", "C1", "r", "07:00") + line("A4", "C1", "r", "07:00") +
		line("A4", "C1", "r", "04:00")
	const or = "; or --keep-unmatched"
	want := []string{
		`night.csv:3: there is no field "A9"; want a field of the survey` + or,
		`night.csv:4: there is no field "a3"; did you mean "A3"?` + or,
		`night.csv:5: program wide has no demand that such an exposure would serve; want one of r in the column demand` + or,
		`night.csv:6: there is no telescope "C9"; want one of C1, S1` + or,
		`night.csv:7: telescope C1 has no filter "z"; want one of g, r` + or,
		`night.csv:8: program pairs has no demand that such an exposure would serve; want one of colour in the column demand` + or,
		`night.csv:9: the exposure of C1 at 2027-03-09T04:00:10Z overlaps that of 2027-03-09T04:00:00Z (night.csv:2, recorded before); want one exposure at a time` + or,
		`night.csv:11: the exposure of C1 at 2027-03-09T07:00:00Z is told otherwise in line 10: field "A3"; want the same, or --correct` + or,
		`night.csv:12: the exposure of C1 at 2027-03-09T04:00:00Z is told otherwise in night.csv:2, recorded before: field "A1"; want the same, or --correct` + or,
	}
	_, got := b.record(text, false)
	if d := cmp.Diff(want, got); d != "" {
		t.Errorf("-want +got:\n%s", d)
	}
	if n := len(b.done()); n != 1 {
		t.Errorf("%d exposures after a refused file; want the 1 from before", n)
	}
	res, got := b.record(text, true)
	if got != nil || res.Done != 11 || res.Unmatched != 9 {
		t.Fatalf("with --keep-unmatched: %+v, %v; want 11 done, 9 of them unmatched", res, got)
	}
	if res, got = b.record(text, false); got != nil || res.Entry != 0 || res.Seen != 11 {
		t.Errorf("kept rows again: %+v, %v; want all 11 seen", res, got)
	}
	c := Credit(b.sv, b.exact, b.done())
	if len(c.Strangers) != 9 || len(c.Visits) != 3 {
		t.Errorf("%d strangers and %d visits; want 9 and 3", len(c.Strangers), len(c.Visits))
	}
	b.sound()
}

func TestContradictionsAreNeverKept(t *testing.T) {
	b := newBench(t)
	text := head[:len(head)-1] + ",site,night\n" +
		"A1,C1,r,2027-03-09T04:00:00Z,2027-03-09T04:05:00Z,,Salt Mesa,\n" +
		"A1,C1,r,2027-03-09T05:00:00Z,2027-03-09T05:05:00Z,,,2027-03-09\n"
	_, got := b.record(text, true)
	want := []string{
		`night.csv:2: telescope C1 isn't at site "Salt Mesa"; want Cinder Ridge, or nothing`,
		`night.csv:3: 2027-03-09T05:00:00Z at C1 lies in the night 2027-03-08, not 2027-03-09; want 2027-03-08, or another instant`,
	}
	if d := cmp.Diff(want, got); d != "" {
		t.Error(d)
	}
}

func TestOverlapsFindTheLaterLine(t *testing.T) {
	b := newBench(t)
	// A long exposure, told last, over two short ones; ends that touch are fine.
	text := head + "A1,C1,r,2027-03-09T04:05:00Z,2027-03-09T04:10:00Z,\nA2,C1,r,2027-03-09T04:10:00Z,2027-03-09T04:15:00Z,\nA3,C1,r,2027-03-09T04:00:00Z,2027-03-09T04:12:00Z,\nA4,S1,r,2027-03-09T04:05:00Z,2027-03-09T04:10:00Z,\n"
	_, got := b.record(text, false)
	if len(got) != 1 || !strings.HasPrefix(got[0], "night.csv:4: the exposure of C1 at 2027-03-09T04:00:00Z overlaps that of 2027-03-09T04:05:00Z (line 2)") {
		t.Errorf("%v", got)
	}
}

// What was recorded before and reaches into the time of a file counts, though
// it starts long before.
func TestOverlapsWithALongExposureOfBefore(t *testing.T) {
	b := newBench(t)
	b.must(head + "A1,C1,r,2027-03-09T02:00:00Z,2027-03-09T05:00:00Z,\n")
	_, got := b.record(head+line("A2", "C1", "r", "04:30")+line("A2", "C1", "r", "05:00")+line("A2", "S1", "r", "04:30"), false)
	if len(got) != 1 || !strings.HasPrefix(got[0], "night.csv:2: the exposure of C1 at 2027-03-09T04:30:00Z overlaps that of 2027-03-09T02:00:00Z (night.csv:2, recorded before)") {
		t.Errorf("%v", got)
	}
}

func TestCorrections(t *testing.T) {
	b := newBench(t)
	const h = "kind,field,telescope,start_utc,end_utc,quality,cause,note\n"
	row := func(field, quality, note string) string {
		return "done," + field + ",C1,2027-03-09T04:00:00Z,2027-03-09T04:05:00Z," + quality + ",," + note + "\n"
	}
	lost := func(note string) string {
		return "lost,,C1,2027-03-09T04:00:00Z,2027-03-09T04:05:00Z,,technical," + note + "\n"
	}
	steps := []struct {
		text    string
		correct bool
		want    string // field and quality that hold then
	}{
		{row("A1", "0.5", ""), true, "A1 0.5"}, // nothing to correct: it is done
		{row("A2", "0.6", "wrong field"), true, "A2 0.6"},
		{row("A1", "0.5", ""), false, "A2 0.6"}, // the old file again
		{row("A2", "0.7", ""), true, "A2 0.7"},
		{row("A2", "0.7", ""), true, "A2 0.7"}, // the correction again
		{row("A2", "0.6", "so it was"), true, "A2 0.6"},
		{lost("shutter stuck"), true, ""},
		{lost("shutter stuck"), true, ""},
		{row("A3", "0.8", "it wasn't"), true, "A3 0.8"},
	}
	history := 0
	for i, s := range steps {
		res, faults := b.recordOn(h+s.text, Terms{Correct: s.correct})
		if faults != nil {
			t.Fatalf("step %d: %v", i+1, faults)
		}
		if res.Entry != 0 {
			history++
		}
		have := ""
		for _, e := range b.done() {
			have += fmt.Sprintf("%s %g", e.Field, e.Quality)
		}
		if have != s.want {
			t.Errorf("after step %d: %q; want %q", i+1, have, s.want)
		}
	}
	_, got := b.record(h+row("A4", "", ""), false)
	if len(got) != 1 || !strings.Contains(got[0], "is told otherwise in night.csv:2, recorded before: field \"A3\"; want the same, or --correct") {
		t.Errorf("another field without --correct: %v", got)
	}
	_, got = b.record(h+"lost,,C1,2027-03-09T04:00:00Z,2027-03-09T04:02:00Z,,weather,\n", false)
	if len(got) != 1 || !strings.Contains(got[0], "C1 recorded an exposure at 2027-03-09T04:00:00Z") {
		t.Errorf("lost without --correct: %v", got)
	}
	l := b.open()
	defer l.Close()
	all, err := l.records(t.Context(), l.db, "1")
	if err != nil || len(all) != history || history != 6 {
		t.Errorf("%d rows of history after %d changes, %v; want one for each of 6", len(all), history, err)
	}
	b.sound()
}

func TestDoneAgainAfterItWasTakenBack(t *testing.T) {
	b := newBench(t)
	b.must(head + line("A1", "C1", "r", "04:00"))
	back := "kind,telescope,start_utc,end_utc,cause\nlost,C1,2027-03-09T04:00:00Z,2027-03-09T04:00:20Z,other\n"
	if res, faults := b.recordOn(back, Terms{Correct: true}); faults != nil || res.Withdrawn != 1 || res.Lost != 1 {
		t.Fatalf("%+v, %v", res, faults)
	}
	_, got := b.record(head+line("A2", "C1", "r", "04:00"), false)
	if len(got) != 1 || !strings.Contains(got[0], "was recorded and taken back (night.csv:2, recorded before); want --correct to set it right again") {
		t.Errorf("%v", got)
	}
}

// Lost time is known by its place and start too.
func TestCorrectedLosses(t *testing.T) {
	b := newBench(t)
	const h = "site,start_utc,end_utc,cause\n"
	lost := func(end, cause string) string {
		return h + "Salt Mesa,2027-03-09T04:00:00Z,2027-03-09T0" + end + ":00:00Z," + cause + "\n"
	}
	b.must(lost("6", "weather"))
	_, got := b.record(lost("5", "weather"), false)
	if len(got) != 1 || got[0] != "night.csv:2: the time lost at Salt Mesa from 2027-03-09T04:00:00Z is told otherwise: until 2027-03-09T06:00:00Z, weather; want the same; or --correct" {
		t.Errorf("%v", got)
	}
	// Mended to an hour, and to the two again.
	for _, end := range []string{"5", "6"} {
		if res, faults := b.recordOn(lost(end, "people"), Terms{Correct: true}); faults != nil || res.Lost != 1 || res.Regained != 1 {
			t.Fatalf("%+v, %v", res, faults)
		}
		l := b.open()
		in, err := l.Losses(t.Context(), b.sv, Now)
		l.Close()
		if err != nil || len(in[1]) != 1 || in[1][0].To-in[1][0].From != float64(int(end[0]-'4')*3600) {
			t.Errorf("to %s: %v, %v", end, in, err)
		}
	}
	b.sound()
}

// The faults of rows and those of their names are told together.
func TestAllFaultsAtOnce(t *testing.T) {
	b := newBench(t)
	_, got := b.record("kind,telescope,site,field,filter,start_utc,end_utc,cause\n"+
		"done,C9,,A9,z,2027-03-09T04:00:00Z,2027-03-09T04:05:00Z,\n"+
		"done,C1,Salt Mesa,A9,z,yesterday,2027-03-09T04:05:00Z,\n"+
		"lost,C9,Salt,,,2027-03-09T04:00:00Z,2027-03-09T03:00:00Z,clouds\n"+
		"gone,C1,,A1,r,2027-03-09T04:00:00Z,2027-03-09T04:05:00Z,\n", false)
	want := []string{
		`night.csv:2: there is no telescope "C9"; want one of C1, S1; or --keep-unmatched`,
		`night.csv:2: there is no filter "z"; want one of g, r; or --keep-unmatched`,
		`night.csv:2: there is no field "A9"; want a field of the survey; or --keep-unmatched`,
		`night.csv:3: start_utc is "yesterday"; want UTC such as 2027-03-09T03:00:00Z, from 1972 to 2099`,
		`night.csv:3: telescope C1 isn't at site "Salt Mesa"; want Cinder Ridge, or nothing`,
		`night.csv:3: telescope C1 has no filter "z"; want one of g, r; or --keep-unmatched`,
		`night.csv:3: there is no field "A9"; want a field of the survey; or --keep-unmatched`,
		`night.csv:4: cause is "clouds"; want weather, technical, people, other`,
		`night.csv:4: it ends at 2027-03-09T03:00:00Z, and starts at 2027-03-09T04:00:00Z; want end_utc after start_utc`,
		`night.csv:4: there is no site "Salt"; want one of Cinder Ridge, Salt Mesa`,
		`night.csv:4: there is no telescope "C9"; want one of C1, S1`,
		`night.csv:5: kind is "gone"; want done or lost`,
	}
	if d := cmp.Diff(want, got); d != "" {
		t.Errorf("-want +got:\n%s", d)
	}
	if n := len(b.done()); n != 0 {
		t.Errorf("%d exposures went in", n)
	}
}

// Nothing is deleted or changed, whoever asks.
func TestTheFileItselfRefusesChanges(t *testing.T) {
	b := newBench(t)
	b.must(head + line("A1", "C1", "r", "04:00"))
	l := b.open()
	defer l.Close()
	for _, bad := range []string{
		"DELETE FROM exposures", "UPDATE exposures SET quality = 1", "DELETE FROM entries", "UPDATE entries SET source = ''", "DELETE FROM names",
		"INSERT INTO exposures SELECT 9, 77, row, what, NULL, telescope, start_utc, end_utc, night, site, field, program, demand, filter, quality, set_id, visit, unmatched, why FROM exposures",
	} {
		if _, err := l.db.Exec(bad); err == nil {
			t.Errorf("%q went through", bad)
		}
	}
	if n := len(b.done()); n != 1 {
		t.Errorf("%d exposures", n)
	}
}

func TestNightsNearTheTransit(t *testing.T) {
	b := newBench(t)
	m := newMatcher(b.sv, b.exact)
	for site := range b.sv.Sites {
		for day := int32(20800); day < 21170; day += 7 { // a year
			in := b.exact.Night(placeOf(b, site), day)
			for _, dt := range []float64{-1200, -1, 0, 1, 900, 1200, 40000} {
				want := day
				if dt < 0 {
					want--
				}
				if got := m.night(site, in.From+dt); int32(got) != want {
					t.Fatalf("site %d, %g s from the transit that starts %d: night %d", site, dt, day, got)
				}
			}
		}
	}
}

func BenchmarkRecordTenThousand(b *testing.B) {
	x := newBench(b)
	text := manyRows(10_000, time.Date(2026, 1, 1, 0, 0, 0, 0, time.UTC))
	for i := 0; b.Loop(); i++ {
		x.path = x.path + "x" // a new ledger each time
		if res := x.must(text); res.Done != 10_000 {
			b.Fatalf("%+v", res)
		}
	}
}
