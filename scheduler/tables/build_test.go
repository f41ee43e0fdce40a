package tables

import (
	"context"
	"errors"
	"math"
	"slices"
	"strings"
	"testing"

	"github.com/google/go-cmp/cmp"

	"nightwright/constraints/mount"
	"nightwright/constraints/survey"
	"nightwright/scheduler/model"
	"nightwright/visibility"
)

func near(a, b, within float64) bool { return math.Abs(a-b) <= within }

// pointing asks the exact path where a row's field stands at an instant.
func (f *fixture) pointing(r *VisitRow, t int, unix float64) mount.Pointing {
	i := slices.IndexFunc(f.sv.Fields, func(x survey.Field) bool { return x.Name == r.Field })
	x := &f.sv.Fields[i]
	h := f.exact.Star(f.place(t), visibility.Position{RA: x.RA, Dec: x.Dec, PMRA: x.PMRA, PMDec: x.PMDec}, unix)
	return mount.Pointing{Altitude: h.Altitude, Azimuth: h.Azimuth, HourAngle: h.HourAngle, Declination: h.Declination}
}

func (f *fixture) telescope(name string) int {
	return slices.IndexFunc(f.sv.Telescopes, func(x survey.Telescope) bool { return x.Name == name })
}

func (f *fixture) place(t int) visibility.Site {
	s := &f.sv.Sites[f.sv.Telescopes[t].Site]
	return visibility.Site{Latitude: s.Latitude, Longitude: s.Longitude, Elevation: s.Elevation}
}

// TestVisitRowsAreWhatTheExactPathSays asks the exact path again, row by row.
func TestVisitRowsAreWhatTheExactPathSays(t *testing.T) {
	f, out, pt := built(t)
	if len(pt.Visits) != len(out.Plan.Exposures) || len(pt.Visits) < 40 {
		t.Fatalf("%d rows of %d exposures; want the same, and at least 40", len(pt.Visits), len(out.Plan.Exposures))
	}
	for i := range pt.Visits {
		r := &pt.Visits[i]
		tel := f.telescope(r.Telescope)
		middle := float64(r.Start+r.End) / 2e6
		p := f.pointing(r, tel, middle)
		moon := f.exact.Moon(f.place(tel), middle)
		sun := f.exact.Sun(f.place(tel), middle)
		if !near(r.Altitude, p.Altitude/deg, 1e-9) || !near(r.Azimuth, p.Azimuth/deg, 1e-9) || !near(r.MoonAltitude, moon.Altitude/deg, 1e-9) || !near(r.SunAltitude, sun.Altitude/deg, 1e-9) {
			t.Errorf("visit %d: %+v; want altitude %g azimuth %g Moon %g Sun %g", r.Visit, *r, p.Altitude/deg, p.Azimuth/deg, moon.Altitude/deg, sun.Altitude/deg)
		}
		// The spherical law of cosines on the horizon, by hand.
		cos := math.Sin(p.Altitude)*math.Sin(moon.Altitude) + math.Cos(p.Altitude)*math.Cos(moon.Altitude)*math.Cos(p.Azimuth-moon.Azimuth)
		if !near(math.Cos(r.MoonSeparation*deg), cos, 1e-12) {
			t.Errorf("visit %d: Moon at %g deg; want %g", r.Visit, r.MoonSeparation, math.Acos(cos)/deg)
		}
		g := visibility.Geometry{SinAltitude: math.Sin(p.Altitude), SunAltitude: sun.Altitude, MoonAltitude: moon.Altitude, MoonSeparation: r.MoonSeparation * deg, MoonPhaseAngle: moon.PhaseAngle}
		filter := f.sv.Filters[strings.Index("gr", r.Filter)]
		if !near(r.Quality, visibility.Quality(filter, g), 1e-12) || !near(r.SkyMagnitude, visibility.SkyMagnitude(filter, g), 1e-9) || !near(r.Airmass, visibility.Airmass(g.SinAltitude), 1e-9) {
			t.Errorf("visit %d: quality %g sky %g airmass %g; want %g %g %g", r.Visit, r.Quality, r.SkyMagnitude, r.Airmass, visibility.Quality(filter, g), visibility.SkyMagnitude(filter, g), visibility.Airmass(g.SinAltitude))
		}
		if r.Exposure != float64(r.End-r.Start)/1e6 || r.State != "planned" {
			t.Errorf("visit %d: %g s, %s", r.Visit, r.Exposure, r.State)
		}
	}
}

// TestGapsAreThoseBetweenTrueDirections: the rows turn one place to both ends
// of the exposure; here each end is asked for by itself.
func TestGapsAreThoseBetweenTrueDirections(t *testing.T) {
	f, _, pt := built(t)
	flips, changes := 0, 0
	for tel := range f.sv.Telescopes {
		var last *VisitRow
		for i := range pt.Visits {
			r := &pt.Visits[i]
			if r.Telescope != f.sv.Telescopes[tel].Name {
				continue
			}
			want := 0.0
			if last != nil && last.Night == r.Night {
				at := func(r *VisitRow, micros int64) mount.Pointing { return f.pointing(r, tel, float64(micros)/1e6) }
				from, to := at(last, last.End), at(r, r.Start)
				fromEast, toEast := mount.East(at(last, last.Start)), mount.East(to)
				want = mount.Gap(&f.sv.Telescopes[tel], from, to, strings.Index("gr", last.Filter), strings.Index("gr", r.Filter), fromEast, toEast)
				if f.sv.Telescopes[tel].Flip != nil && fromEast != toEast {
					flips++
				}
				if last.Filter != r.Filter {
					changes++
				}
			}
			if !near(r.GapBefore, want, 1e-5) {
				t.Errorf("visit %d on %s: gap %g s; want %g", r.Visit, r.Telescope, r.GapBefore, want)
			}
			last = r
		}
	}
	if flips == 0 || changes == 0 {
		t.Errorf("%d flips and %d filter changes in the plan; want some of each", flips, changes)
	}
}

// TestPositionsComeBackAsWritten: degrees from a file go through radians.
func TestPositionsComeBackAsWritten(t *testing.T) {
	for _, x := range []float64{93.8179, 10.123456789, -0.0001, 359.9999999, 45.1, -89.87654321} {
		if got := written(x / 180 * math.Pi); got != x {
			t.Errorf("%s came back as %s", Float(x), Float(got))
		}
	}
}

func TestCreditsAndBonusesSumToCoverage(t *testing.T) {
	f, _, pt := built(t)
	s := pt.Summary
	sum, total := 0.0, f.sv.TotalWeight()
	for i := range pt.Visits {
		sum += pt.Visits[i].Credit
	}
	for i := range pt.Fields {
		sum += pt.Fields[i].Weight * pt.Fields[i].Bonus / ((1 + f.sv.FinishBonus) * total)
	}
	if !near(sum, s.Coverage, 1e-12) || s.Coverage <= 0 || s.FieldsFinished == 0 {
		t.Errorf("credits and bonuses sum to %.15g; coverage is %.15g with %d fields finished", sum, s.Coverage, s.FieldsFinished)
	}
	again, err := Coverage(f.sv, pt.Visits)
	if err != nil || again != s.Score {
		t.Errorf("recount from the rows: %+v, %v; want %+v", again, err, s.Score)
	}
	var by Score
	for _, p := range s.Programs {
		by.VisitsGot += p.VisitsGot
		by.VisitsWanted += p.VisitsWanted
		by.FieldsFinished += p.FieldsFinished
		by.FieldsWanted += p.FieldsWanted
	}
	by.Coverage = s.Coverage
	if by != s.Score {
		t.Errorf("the programs sum to %+v; want %+v", by, s.Score)
	}
	if w := s.Programs; !near(w[0].Share+w[1].Share, 1, 1e-12) || w[1].ShareBreach != 0.01 || w[1].ShareWhy == "" || w[1].ShareMin != 0.1 {
		t.Errorf("programs: %+v", w)
	}
	if !near(s.Gap, 1-s.Coverage, 1e-12) { // the fixture's ceiling is 1
		t.Errorf("gap %g; want %g", s.Gap, 1-s.Coverage)
	}
}

func TestVisitsOverTheCountEarnNothing(t *testing.T) {
	f, _, pt := built(t)
	var credits []float64
	for i := range pt.Visits {
		if r := &pt.Visits[i]; r.Field == f.sv.Fields[extraField].Name && r.Demand == "r" {
			credits = append(credits, r.Credit)
		}
	}
	if len(credits) != 2 || credits[0] <= 0 || credits[1] != 0 {
		t.Errorf("credits of a visit wanted once and planned twice: %v; want the first alone to earn", credits)
	}
}

func TestNightsAddUp(t *testing.T) {
	f, _, pt := built(t)
	if want := len(f.sv.Telescopes) * f.sv.Nights(); len(pt.Nights) != want {
		t.Fatalf("%d night rows; want %d", len(pt.Nights), want)
	}
	var sum, rows Hours
	visits := int64(0)
	for i := range pt.Nights {
		sum.add(&pt.Nights[i])
		visits += pt.Nights[i].Visits
	}
	sets := map[int64]bool{}
	wantVisits := int64(0)
	for i := range pt.Visits {
		r := &pt.Visits[i]
		rows.Exposure += r.Exposure / 3600
		rows.Used += (r.Exposure + r.GapBefore) / 3600
		if r.Set == 0 || !sets[r.Set] {
			wantVisits++
		}
		sets[r.Set] = true
	}
	h := pt.Summary.Hours
	if !near(sum.Exposure, rows.Exposure, 1e-9) || !near(sum.Used, rows.Used, 1e-9) || !near(h.Used, sum.Used, 1e-9) || !near(h.Open, sum.Open, 1e-9) || !near(h.Dark, sum.Dark, 1e-9) {
		t.Errorf("nights %+v, rows %+v, summary %+v; want them to agree", sum, rows, h)
	}
	if visits != wantVisits || len(sets) < 3 {
		t.Errorf("%d visits in the nights; want %d (%d sets)", visits, wantVisits, len(sets)-1)
	}
	for i := range pt.Nights {
		r := &pt.Nights[i]
		tel := f.telescope(r.Telescope)
		n := int(r.Night - int32(night0))
		// The mean price by one-second steps.
		mean, open := 0.0, 0.0
		for _, o := range f.cal.Open(tel, n) {
			for x := o.From + 0.5; x < o.To; x++ {
				slot := int64(math.Floor(x/600)) * 600
				k := slices.IndexFunc(pt.Prices, func(p PriceRow) bool { return p.Telescope == r.Telescope && p.SlotStart == slot*1e6 })
				mean += pt.Prices[k].PricePerHour
				open++
			}
		}
		if !near(r.PricePerHour, mean/open, 1e-3*r.PricePerHour) {
			t.Errorf("%s %s: mean price %g; want %g", r.Telescope, Date(r.Night), r.PricePerHour, mean/open)
		}
	}
}

func TestBuildDoesNotDependOnWorkersOrOrder(t *testing.T) {
	f, out, pt := built(t)
	for _, workers := range []int{1, 8} {
		shuffled := *out
		shuffled.Plan = &model.Plan{Exposures: slices.Clone(out.Plan.Exposures)}
		slices.Reverse(shuffled.Plan.Exposures)
		again, err := f.build(&shuffled, workers)
		if err != nil {
			t.Fatal(err)
		}
		if d := cmp.Diff(pt, again); d != "" {
			t.Errorf("%d workers, reversed plan (-2 workers +this):\n%s", workers, d)
		}
	}
}

func TestBuildRefusesACeilingThatIsBeaten(t *testing.T) {
	f, out, pt := built(t)
	out.Ceiling = pt.Summary.Coverage * (1 - 1e-9)
	if _, err := f.build(out, 1); err == nil || !strings.Contains(err.Error(), "over the ceiling") {
		t.Errorf("a ceiling under the coverage: %v; want an error", err)
	}
	out.Ceiling = pt.Summary.Coverage
	if again, err := f.build(out, 1); err != nil || again.Summary.Gap != 0 {
		t.Errorf("a ceiling that is just reached: %v", err)
	}
}

func TestBuildRefusesWhatDoesNotFit(t *testing.T) {
	f, out, _ := built(t)
	for name, spoil := range map[string]func(*model.Exposure){
		"field": func(e *model.Exposure) { e.Field = 99 }, "demand": func(e *model.Exposure) { e.Demand = 7 }, "step": func(e *model.Exposure) { e.Step = 2 },
		"telescope": func(e *model.Exposure) { e.Telescope = -1 }, "length": func(e *model.Exposure) { e.End = e.Start },
	} {
		bad := *out
		bad.Plan = &model.Plan{Exposures: slices.Clone(out.Plan.Exposures)}
		spoil(&bad.Plan.Exposures[3])
		if _, err := f.build(&bad, 1); err == nil || !strings.Contains(err.Error(), "doesn't fit") {
			t.Errorf("%s: %v; want an error", name, err)
		}
	}
	ctx, cancel := context.WithCancel(context.Background())
	cancel()
	if _, err := Build(ctx, f.sv, f.exact, f.cal, f.win, out, 1); !errors.Is(err, context.Canceled) {
		t.Errorf("stopped: %v; want context.Canceled", err)
	}
}
