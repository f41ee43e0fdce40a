package sheet

import (
	"math"
	"testing"

	"nightwright/constraints"
	"nightwright/constraints/mount"
)

// slackOf is how late an exposure may be, s.
func slackOf(l Line) float64 { return l.Latest - l.Start }

func TestLatestIsBoundByTheNextExposure(t *testing.T) {
	f := busy(t)
	x := exposures(f.sheet(t, "C1", 0))
	// E000 at 04:00:00 for 60 s, E001 at 04:02:00, and the slew between.
	want := 60 - x[1].Visit.GapBefore
	if x[0].LatestBy != ByNext || slackOf(x[0]) > want || slackOf(x[0]) < want-2 {
		t.Errorf("slack %g s by %s; want about %g by next", slackOf(x[0]), x[0].LatestBy, want)
	}
	// The set's first exposure: the second follows 600 +- 120 s after.
	if x[2].LatestBy != BySet || slackOf(x[2]) != 120 {
		t.Errorf("slack %g s by %s; want 120 by set", slackOf(x[2]), x[2].LatestBy)
	}
	if x[3].LatestBy != BySet || slackOf(x[3]) != 120 {
		t.Errorf("slack %g s by %s; want 120 by set", slackOf(x[3]), x[3].LatestBy)
	}
}

// TestLatestMinds: a gap.min of an hour to a later visit on the other
// telescope, the end of the open time, and the rules.
func TestLatestMinds(t *testing.T) {
	f := prepare(t, oneSite())
	f.add(0, 0, 0, 0, at(4, 0, 0), 0)
	f.add(0, 0, 1, 0, at(5, 10, 0), 0)
	x := exposures(f.sheet(t, "C1", 0))[0]
	if x.LatestBy != ByCadence || slackOf(x) != 600 {
		t.Errorf("slack %g s by %s; want 600 by cadence", slackOf(x), x.LatestBy)
	}

	// Focus starts two hours after the first open instant.
	f = prepare(t, oneSite())
	block := f.cal.Reserved(0, 0)[1]
	f.add(1, 0, 0, 0, math.Floor(block.From)-200, 0)
	x = exposures(f.sheet(t, "C1", 0))[0]
	if want := math.Floor(block.From - 60); x.LatestBy != ByOpen || x.Latest != want {
		t.Errorf("latest %g by %s; want %g by open", x.Latest, x.LatestBy, want)
	}

	// E000 goes under its limit in the morning: the window's end, which comes
	// from the fast path and is rounded inward.
	f = prepare(t, oneSite())
	windows := f.win.Of(f.win.Unit(0, 0), f.win.Class(1), 0)
	end := f.win.Interval(windows[len(windows)-1]).To
	f.add(0, 0, 1, 0, end-2000, 0)
	x = exposures(f.sheet(t, "C2", 0))[0]
	if want := end - 60; x.LatestBy != ByRules || x.Latest < want-1 || x.Latest > want+2 {
		t.Errorf("latest %g by %s; want %g by rules", x.Latest, x.LatestBy, want)
	}
}

// TestLatestStartsHarmNothing slips each exposure of a night to its latest
// start and judges it again from scratch, every second.
func TestLatestStartsHarmNothing(t *testing.T) {
	f := busy(t)
	for _, field := range []int{0, 1, 2, 3} { // a denser night on the flipping mount
		for k := range 3 {
			f.add(field, 1, 1, 0, at(4+field, 1+19*k, 0), 0)
		}
	}
	pt := f.tables(t)
	slipped := 0
	for tel, name := range []string{"C1", "C2"} {
		x := exposures(f.sheet(t, name, 0))
		for i, l := range x {
			if l.Latest < l.Start || l.Latest != math.Floor(l.Latest) && l.Latest != l.Start {
				t.Errorf("%s %d: latest %g for a start at %g", name, l.Order, l.Latest, l.Start)
			}
			if l.Latest == l.Start {
				continue
			}
			slipped++
			b := &builder{sv: f.sv, exact: f.exact, cal: f.cal, telescope: tel, place: constraints.Place(&f.sv.Sites[0])}
			if err := b.take(pt); err != nil {
				t.Fatal(err)
			}
			s := &b.shots[i]
			for sec := 0.0; sec <= s.length; sec++ {
				sight := b.sight(s, l.Latest+sec)
				if why := constraints.Evaluate(f.sv, s.field, s.demand, tel, &sight); why != 0 || f.cal.Reasons(tel, l.Latest+sec-1e-3) != 0 {
					t.Errorf("%s %d: %s breaks %v (%v) at %g s", name, l.Order, l.LatestBy, why, f.cal.Reasons(tel, l.Latest+sec-1e-3), sec)
					break
				}
			}
			if i+1 == len(x) {
				continue
			}
			n := &b.shots[i+1]
			from, to := b.point(s, l.Latest+s.length), b.point(n, n.start)
			gap := mount.Gap(&f.sv.Telescopes[tel], from, to, b.filter(s), b.filter(n), mount.East(b.point(s, l.Latest)), mount.East(to))
			if room := n.start - l.Latest - s.length; room < gap-1e-3 {
				t.Errorf("%s %d: slipped by %g s there are %g s to the next; want %g", name, l.Order, l.Latest-l.Start, room, gap)
			}
		}
	}
	if slipped < 8 {
		t.Errorf("only %d exposures could slip; want 8 at least for the test to mean something", slipped)
	}
}
