package starter

import (
	"math"
	"testing"

	"github.com/google/go-cmp/cmp"

	"nightwright/constraints/survey"
)

func TestFamiliesHaveTheirSize(t *testing.T) {
	for _, f := range families {
		for seed := range uint64(10) {
			sv := Family(f.name, seed)
			if len(sv.Sites) != f.sites || len(sv.Telescopes) != f.sites || sv.Nights() != f.nights || len(sv.Fields) != f.fields {
				t.Errorf("%s: %d sites, %d nights, %d fields; want %d, %d, %d", sv.Name, len(sv.Sites), sv.Nights(), len(sv.Fields), f.sites, f.nights, f.fields)
			}
			var places []plainSite
			for _, s := range sv.Sites {
				places = append(places, plainSite{s.Latitude / degree, s.Longitude / degree})
			}
			open := supply(places, int(sv.FirstNight)-epochDay, f.nights, -15)
			visits, seconds := wants(sv, 12)
			t.Logf("%s: %d visits, %.3f of the supply", sv.Name, visits, seconds/open)
			// Halving the visits of pairs rounds up; a visit of each of 80
			// fields may be too much already.
			most := map[string]float64{"sets": 0.5, "tiny80": 2}[f.name]
			if off := math.Abs(seconds/open - f.demand); off > max(0.15, most) {
				t.Errorf("%s: demand %.3f of the supply; want %g", sv.Name, seconds/open, f.demand)
			}
			for p := range sv.Programs {
				for _, d := range sv.Programs[p].Demands {
					for _, e := range d.Exposures {
						if e.Duration < f.shortest || e.Duration > f.longest {
							t.Errorf("%s: an exposure of %g s; want %g to %g", sv.Name, e.Duration, f.shortest, f.longest)
						}
					}
				}
			}
		}
	}
}

func TestFamilyIsTheSameForASeed(t *testing.T) {
	for _, name := range FamilyNames() {
		a, b, c := Family(name, 3), Family(name, 3), Family(name, 4)
		if d := cmp.Diff(a, b); d != "" {
			t.Errorf("%s differs from call to call: %s", name, d)
		}
		if cmp.Equal(a.Fields, c.Fields) {
			t.Errorf("%s: two seeds gave the same fields", name)
		}
	}
	if Family("huge", 1) != nil {
		t.Error("a family that is not there was made")
	}
}

func TestFamilyStartsInMarch(t *testing.T) {
	if got := survey.Day(familyFirstNight).String(); got != "2027-03-01" {
		t.Errorf("first night %s; want 2027-03-01", got)
	}
}
