package ledger

import (
	"errors"
	"slices"
	"strings"
	"testing"
	"time"

	"github.com/google/go-cmp/cmp"
	"pgregory.net/rapid"

	"nightwright/constraints"
	"nightwright/constraints/survey"
	"nightwright/visibility"
)

func (b *bench) lose(r Row) (*Result, error) {
	b.Helper()
	l := b.open()
	defer l.Close()
	return l.Lose(b.Context(), b.sv, b.exact, r, Entry{Made: time.Unix(1.8e9, 0), Program: "1.0"})
}

func (b *bench) losses(upTo int64) [][]visibility.Interval {
	b.Helper()
	l, err := Open(b.path)
	if err != nil {
		b.Fatal(err)
	}
	defer l.Close()
	got, err := l.Losses(b.Context(), b.sv, upTo)
	if err != nil {
		b.Fatal(err)
	}
	return got
}

func TestLose(t *testing.T) {
	b := newBench(t)
	at := func(s float64) int64 { return t0400 + int64(s*1e6) }
	const from = t0400 / 1e6
	steps := []struct {
		r    Row
		want []visibility.Interval // of C1, from 04:00
	}{
		{Row{What: Lost, Site: "Cinder Ridge", Start: at(0), End: at(100), Cause: "weather"}, []visibility.Interval{{From: 0, To: 100}}},
		{Row{What: Lost, Telescope: "C1", Start: at(50), End: at(150), Cause: "technical", Note: "dome"}, []visibility.Interval{{From: 0, To: 150}}},
		{Row{What: Regained, Telescope: "C1", Start: at(20), End: at(60)}, []visibility.Interval{{From: 0, To: 20}, {From: 60, To: 150}}},
		{Row{What: Lost, Telescope: "S1", Start: at(0), End: at(500), Cause: "people"}, []visibility.Interval{{From: 0, To: 20}, {From: 60, To: 150}}},
	}
	for i, s := range steps {
		res, err := b.lose(s.r)
		if err != nil || res.Entry != int64(i+1) {
			t.Fatalf("step %d: %+v, %v", i, res, err)
		}
		var want []visibility.Interval
		for _, w := range s.want {
			want = append(want, visibility.Interval{From: from + w.From, To: from + w.To})
		}
		if d := cmp.Diff(want, b.losses(Now)[0]); d != "" {
			t.Errorf("step %d:\n%s", i, d)
		}
		if res, err = b.lose(s.r); err != nil || res.Entry != 0 || res.Seen != 1 {
			t.Errorf("step %d again: %+v, %v; want nothing new", i, res, err)
		}
	}
	// As it stood after the first entry, for a plan made then.
	if got := b.losses(1); len(got[0]) != 1 || got[0][0].To != from+100 || got[1] != nil {
		t.Errorf("after entry 1: %v", got)
	}
	if got := b.losses(0); got != nil {
		t.Errorf("before any entry: %v", got)
	}
	for want, r := range map[string]Row{
		`there is no site "Salt"; want one of Cinder Ridge, Salt Mesa`:                                                   {What: Lost, Site: "Salt", Start: 1, End: 2, Cause: "other"},
		`there is no telescope "c1"; did you mean "C1"?`:                                                                 {What: Lost, Telescope: "c1", Start: 1, End: 2, Cause: "other"},
		`telescope C1 isn't at site "Salt Mesa"; want Cinder Ridge, or nothing`:                                          {What: Lost, Site: "Salt Mesa", Telescope: "C1", Start: 1, End: 2, Cause: "other"},
		`no time was recorded as lost there between 2027-03-09T05:00:00Z and 2027-03-09T05:00:01Z; want a stretch of it`: {What: Regained, Telescope: "C1", Start: at(3600), End: at(3601)},
	} {
		_, err := b.lose(r)
		var row *RowError
		if !errors.As(err, &row) || err.Error() != want {
			t.Errorf("got %v; want %s", err, want)
		}
	}
	b.sound()
}

func TestAWholeNightIsLost(t *testing.T) {
	b := newBench(t)
	b.must("site,night,cause\nSalt Mesa,2027-03-09,weather\n")
	lost := b.losses(Now)
	cal := constraints.NewCalendar(b.sv, b.exact, lost)
	if h := cal.OpenHours(1, 1); h != 0 {
		t.Errorf("S1 is open for %g h of a night that was lost", h)
	}
	free := constraints.NewCalendar(b.sv, b.exact, nil)
	for _, n := range []int{0, 3} { // night 2 is closed
		if got, want := cal.OpenHours(1, n), free.OpenHours(1, n); got != want || want < 5 {
			t.Errorf("night %d: open %g h with the loss, %g h without", n, got, want)
		}
	}
	if cal.OpenHours(0, 1) != free.OpenHours(0, 1) {
		t.Error("a night lost at Salt Mesa closed Cinder Ridge")
	}
}

// What holds is what a plain second-by-second account says.
func TestLostTimeIsThePlainAccount(t *testing.T) {
	sv := &survey.Survey{Sites: []survey.Site{{Name: "A"}}, Telescopes: []survey.Telescope{{Name: "T"}, {Name: "U"}}}
	rapid.Check(t, func(rt *rapid.T) {
		const length = 40
		var plain [2][length]string
		var rows []Loss
		for range rapid.IntRange(1, 12).Draw(rt, "rows") {
			from := rapid.IntRange(0, length-1).Draw(rt, "from")
			to := rapid.IntRange(from+1, length).Draw(rt, "to")
			r := Loss{What: Lost, Site: "A", Start: int64(from) * 1e6, End: int64(to) * 1e6, Cause: rapid.SampledFrom(Causes()).Draw(rt, "cause")}
			r.Telescope = rapid.SampledFrom([]string{"", "T", "U", "gone"}).Draw(rt, "telescope")
			if rapid.Bool().Draw(rt, "regained") {
				r.What, r.Cause = Regained, ""
			}
			rows = append(rows, r)
			for i, name := range []string{"T", "U"} {
				for s := from; s < to && (r.Telescope == "" || r.Telescope == name); s++ {
					if r.What == Regained {
						plain[i][s] = ""
					} else if plain[i][s] == "" {
						plain[i][s] = r.Cause
					}
				}
			}
		}
		lost := LostTime(sv, rows)
		for i := range plain {
			var got [length]string
			last := -1.0
			for _, x := range lost[i] {
				if x.From < last || x.To <= x.From {
					rt.Fatalf("stretches %v are not ascending and disjoint", lost[i])
				}
				last = x.To
				for s := int(x.From); s < int(x.To); s++ {
					got[s] = x.Cause
				}
			}
			if got != plain[i] {
				rt.Fatalf("telescope %d:\n got %s\nwant %s", i, strings.Join(got[:], ","), strings.Join(plain[i][:], ","))
			}
			for k, x := range Intervals(lost)[i][:max(0, len(Intervals(lost)[i])-1)] {
				if x.To >= Intervals(lost)[i][k+1].From {
					rt.Fatalf("intervals %v touch", Intervals(lost)[i])
				}
			}
		}
	})
	if slices.Contains(Causes(), "") {
		t.Error("a cause without a name")
	}
}
