package survey

import (
	"math"
	"testing"
)

func TestDays(t *testing.T) {
	d, err := ParseDay("2027-02-01")
	if err != nil {
		t.Fatal(err)
	}
	// 2027-02-01 00:00Z is 1,801,440,000 s after 1970 (date -u -d 2027-02-01 +%s).
	if d.Unix() != 1801440000 || d.String() != "2027-02-01" || d.Month() != 1 {
		t.Errorf("%d is %s, %g s, month %d", d, d, d.Unix(), d.Month())
	}
	if (d - 1).String() != "2027-01-31" {
		t.Errorf("the day before is %s", d-1)
	}
	for _, bad := range []string{"", "2027-2-1", "2027-02-30", "yesterday", "2027-02-01T00:00:00Z"} {
		if _, err := ParseDay(bad); err == nil {
			t.Errorf("%q is taken for a date", bad)
		}
	}
	sv := Survey{FirstNight: d, LastNight: d}
	if sv.Nights() != 1 {
		t.Errorf("one night is %d", sv.Nights())
	}
}

func TestTilesInFieldsOfView(t *testing.T) {
	circle, box := FieldOfView{Diameter: 2}, FieldOfView{Width: 3, Height: 1}
	if !circle.Holds(2) || circle.Holds(2.01) || !box.Holds(1) || box.Holds(1.01) {
		t.Error("a tile fits the diameter, or the narrower side")
	}
}

func twoTelescopes() *Survey {
	one := Demand{Name: "g", Visits: 3, Exposures: []Exposure{{Filter: 0}}}
	set := Demand{Name: "colour", Visits: 1, Exposures: []Exposure{{Filter: 0}, {Filter: 1}}}
	return &Survey{
		Programs: []Program{{Weight: 2, Demands: []Demand{one, set}}},
		Fields: []Field{{Weight: 1.5, Rules: []Rules{
			{SunAltitudeMax: -0.3}, {SunAltitudeMax: -0.2},
		}}},
		Telescopes: []Telescope{
			{Filters: []int{0}, FieldOfView: FieldOfView{Diameter: 1}},
			{Filters: []int{0, 1}, FieldOfView: FieldOfView{Diameter: 2}},
		},
	}
}

func TestWhoQualifies(t *testing.T) {
	for _, tt := range []struct {
		msg    string
		edit   func(*Survey)
		demand int
		want   [2]bool
	}{
		{"one filter, both carry it", func(*Survey) {}, 0, [2]bool{true, true}},
		{"a set needs all its filters", func(*Survey) {}, 1, [2]bool{false, true}},
		{"the program's list", func(s *Survey) { s.Programs[0].Telescopes = []int{0} }, 0, [2]bool{true, false}},
		{"the field's list", func(s *Survey) { s.Fields[0].Telescopes = []int{1} }, 0, [2]bool{false, true}},
		{"an empty list is nobody", func(s *Survey) { s.Fields[0].Telescopes = []int{} }, 0, [2]bool{}},
		{"a wide tile", func(s *Survey) { s.Fields[0].Tile = 1.5 }, 0, [2]bool{false, true}},
	} {
		s := twoTelescopes()
		tt.edit(s)
		for i, want := range tt.want {
			if got := s.Qualifies(&s.Fields[0], &s.Programs[0].Demands[tt.demand], i); got != want {
				t.Errorf("%s: telescope %d qualifies: %v, want %v", tt.msg, i, got, want)
			}
		}
	}
}

func TestSums(t *testing.T) {
	s := twoTelescopes()
	if got := s.Wanted(&s.Fields[0]); got != 4 {
		t.Errorf("3 + 1 visits wanted: got %d", got)
	}
	if got := s.TotalWeight(); got != 3 {
		t.Errorf("weight 2 x 1.5: got %g", got)
	}
	if !s.Programs[0].Demands[1].IsSet() || s.Programs[0].Demands[0].IsSet() {
		t.Error("two exposures are a set, one isn't")
	}
	for i, want := range []float64{-0.3, -0.2} { // the first can't do the set
		if got, ok := s.LoosestSun(i); !ok || got != want {
			t.Errorf("telescope %d: loosest Sun limit %g, %v; want %g", i, got, ok, want)
		}
	}
	s.Telescopes[0].Filters = nil
	if got, ok := s.LoosestSun(0); ok || math.IsNaN(got) {
		t.Errorf("nothing to do, yet a limit %g", got)
	}
}
