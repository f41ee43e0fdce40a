package constraints

import (
	"context"
	"slices"
	"testing"

	"nightwright/visibility"
)

// TestWindowsOnAnotherCalendar: windows taken over to a calendar with lost
// time are those worked out with it.
func TestWindowsOnAnotherCalendar(t *testing.T) {
	sv := makeSurvey(2, 4, 12, 5)
	b := build(t, sv, 2)
	losses := make([][]visibility.Interval, len(sv.Telescopes))
	night := b.cal.Night(sv.Telescopes[0].Site, 1)
	losses[0] = []visibility.Interval{night}
	cal := NewCalendar(sv, newExact(), losses)
	fresh, err := NewWindows(context.Background(), sv, b.sky, cal, 2)
	if err != nil {
		t.Fatal(err)
	}
	taken := b.win.On(cal)
	fewer := false
	for f := range sv.Fields {
		for d := range sv.Programs[sv.Fields[f].Program].Demands {
			if got, want := taken.UsableHours(f, d), fresh.UsableHours(f, d); got != want {
				t.Errorf("field %d demand %d: %v usable hours; want %v", f, d, got, want)
			}
			fewer = fewer || taken.UsableHours(f, d) < b.win.UsableHours(f, d)
			for tel := range sv.Telescopes {
				for n := range sv.Nights() {
					if got, want := taken.Of(taken.Unit(f, d), taken.Class(tel), n), fresh.Of(fresh.Unit(f, d), fresh.Class(tel), n); !slices.Equal(got, want) {
						t.Fatalf("field %d demand %d telescope %d night %d: %v; want %v", f, d, tel, n, got, want)
					}
				}
			}
		}
	}
	if !fewer {
		t.Error("a lost night takes no usable hour from anyone; the test tests nothing")
	}
}
