package constraints

import (
	"bytes"
	"errors"
	"math"
	"reflect"
	"testing"

	"nightwright/constraints/survey"
	"nightwright/visibility"
	"nightwright/visibility/ephemeris"
)

func TestStoredWindowsAreTheSame(t *testing.T) {
	b := prepared(t, makeSurvey(3, 4, 60, 5))
	sky, cal := b.sky, b.cal
	key := WindowsKey(b.sv, sky, cal)
	var store bytes.Buffer
	if err := b.win.Store(&store, key); err != nil {
		t.Fatal(err)
	}
	got, err := ReadWindows(store.Bytes(), key, b.sv, cal, 3)
	if err != nil {
		t.Fatal(err)
	}
	if !reflect.DeepEqual(got.nights, b.win.nights) || !reflect.DeepEqual(got.unitOf, b.win.unitOf) || got.epoch != b.win.epoch {
		t.Error("the stored windows are others")
	}
	// Damage anywhere is noticed, and so is another key.
	for _, at := range []int{0, len(windowsMagic), store.Len() / 2, store.Len() - 1} {
		bad := bytes.Clone(store.Bytes())
		bad[at] ^= 1
		if _, err := ReadWindows(bad, key, b.sv, cal, 1); !errors.Is(err, ErrNotTheseWindows) {
			t.Errorf("byte %d changed: %v", at, err)
		}
	}
	for _, n := range []int{0, 10, 60, store.Len() - 5} {
		if _, err := ReadWindows(store.Bytes()[:n], key, b.sv, cal, 1); !errors.Is(err, ErrNotTheseWindows) {
			t.Errorf("cut to %d bytes: %v", n, err)
		}
	}
	key[3]++
	if _, err := ReadWindows(store.Bytes(), key, b.sv, cal, 1); !errors.Is(err, ErrNotTheseWindows) {
		t.Errorf("another key: %v", err)
	}
}

// TestTheKeyHangsOnWhatWindowsDo: what changes windows changes the key, what
// doesn't leaves it.
func TestTheKeyHangsOnWhatWindowsDo(t *testing.T) {
	key := func(change func(sv *survey.Survey)) [32]byte {
		sv := makeSurvey(2, 3, 20, 5)
		if change != nil {
			change(sv)
		}
		b := prepared(t, sv)
		return WindowsKey(b.sv, b.sky, b.cal)
	}
	plain := key(nil)
	for what, change := range map[string]func(sv *survey.Survey){
		"weight":      func(sv *survey.Survey) { sv.Fields[0].Weight += 3 },
		"visits":      func(sv *survey.Survey) { sv.Programs[0].Demands[0].Visits += 3 },
		"min_quality": func(sv *survey.Survey) { sv.Fields[0].Rules[0].MinQuality = 0.77 },
		"a closure": func(sv *survey.Survey) {
			sv.Telescopes[0].Closures = []survey.Closure{{From: 0, To: sv.FirstNight.Unix() + 2e5}}
		},
	} {
		if key(change) != plain {
			t.Errorf("%s changes the key", what)
		}
	}
	for what, change := range map[string]func(sv *survey.Survey){
		"right ascension": func(sv *survey.Survey) { sv.Fields[0].RA += 1e-6 },
		"not_before":      func(sv *survey.Survey) { sv.Fields[0].NotBefore = sv.FirstNight.Unix() + 1e5 },
		"altitude":        func(sv *survey.Survey) { sv.Fields[0].Rules[0].AltitudeMin += 1e-6 },
		"latitude":        func(sv *survey.Survey) { sv.Sites[0].Latitude += 1e-7 },
		"a mount's limit": func(sv *survey.Survey) { sv.Telescopes[0].AltitudeMax -= 1e-6 },
		"the period":      func(sv *survey.Survey) { sv.LastNight++ },
		"who may observe": func(sv *survey.Survey) { sv.Fields[0].Telescopes = []int{0} },
		"DUT1":            func(sv *survey.Survey) { sv.Orientation.DUT1 = math.Copysign(0.3, -1) },
	} {
		if key(change) == plain {
			t.Errorf("%s leaves the key", what)
		}
	}
}

// prep is a survey with its sky, calendar and windows.
type prep struct {
	sv  *survey.Survey
	sky *visibility.Sky
	cal *Calendar
	win *Windows
}

func prepared(t *testing.T, sv *survey.Survey) *prep {
	t.Helper()
	e := visibility.NewExact(ephemeris.NewClock(sv.LeapSeconds, sv.Orientation))
	p := &prep{sv: sv, sky: Tables(sv, e, 2), cal: NewCalendar(sv, e, nil)}
	var err error
	if p.win, err = NewWindows(t.Context(), sv, p.sky, p.cal, 2); err != nil {
		t.Fatal(err)
	}
	return p
}
