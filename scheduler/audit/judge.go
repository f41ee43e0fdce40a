package audit

import (
	"context"
	"errors"
	"math"
	"sync"

	"nightwright/constraints/survey"
	"nightwright/visibility"
	"nightwright/visibility/ephemeris"
)

// What is forgiven; see the package's comment.
const (
	angleSlack = 2e-9 // rad
	timeSlack  = 2    // us, between instants that are given
	rootSlack  = 1e-3 // s, at edges that the Sun fixes
	ratioSlack = 1e-9 // relative, of pure numbers such as airmass and quality
)

// longestStep is the most time between two tests of an exposure, s.
const longestStep = 30.0

// Judge holds a survey's nights and names, worked out once; it can judge any
// number of plans. It is safe for concurrent use.
type Judge struct {
	sv      *survey.Survey
	exact   *visibility.Exact
	workers int
	sites   []visibility.Site
	places  []visibility.Position
	total   float64 // sum of all fields' weights
	loosest []float64
	served  []bool
	nights  [][]night     // by site and night
	open    [][]openNight // by telescope and night

	siteIDs, telescopeIDs, fieldIDs, filterIDs, programIDs map[string]int
}

// Check judges a plan. It errs only when ctx ends: whatever is wrong with the
// plan is a breach.
func Check(ctx context.Context, in Input) (*Report, error) {
	j, err := NewJudge(ctx, in.Survey, in.Exact, in.Losses, in.Workers)
	if err != nil {
		return nil, err
	}
	return j.Check(ctx, in.Plan)
}

// NewJudge works out the nights and open times of a survey. The arguments are
// those of Input. It errs when ctx ends.
func NewJudge(ctx context.Context, sv *survey.Survey, exact *visibility.Exact, losses [][]visibility.Interval, workers int) (*Judge, error) {
	if exact == nil {
		exact = visibility.NewExact(ephemeris.NewClock(sv.LeapSeconds, sv.Orientation))
	}
	j := &Judge{sv: sv, exact: exact, workers: max(1, workers)}
	j.siteIDs = ids(len(sv.Sites), func(i int) string { return sv.Sites[i].Name })
	j.telescopeIDs = ids(len(sv.Telescopes), func(i int) string { return sv.Telescopes[i].Name })
	j.fieldIDs = ids(len(sv.Fields), func(i int) string { return sv.Fields[i].Name })
	j.filterIDs = ids(len(sv.Filters), func(i int) string { return sv.Filters[i].Name })
	j.programIDs = ids(len(sv.Programs), func(i int) string { return sv.Programs[i].Name })
	for i := range sv.Sites {
		s := &sv.Sites[i]
		j.sites = append(j.sites, visibility.Site{Latitude: s.Latitude, Longitude: s.Longitude, Elevation: s.Elevation})
	}
	for i := range sv.Fields {
		f := &sv.Fields[i]
		j.places = append(j.places, visibility.Position{RA: f.RA, Dec: f.Dec, PMRA: f.PMRA, PMDec: f.PMDec})
		j.total += sv.Programs[f.Program].Weight * f.Weight
	}
	j.findLoosest()
	if err := j.openNights(ctx, losses); err != nil {
		return nil, err
	}
	return j, nil
}

// ids maps names to their index; of equal names the first counts.
func ids(n int, name func(int) string) map[string]int {
	m := make(map[string]int, n)
	for i := n - 1; i >= 0; i-- {
		m[name(i)] = i
	}
	return m
}

// qualifies tells whether a telescope may observe a demand: it is on the
// lists of program and field, carries every filter, and its field of view
// holds the tile. Otherwise why says what is missing.
func (j *Judge) qualifies(field, demand, telescope int) (why string) {
	f := &j.sv.Fields[field]
	p := &j.sv.Programs[f.Program]
	t := &j.sv.Telescopes[telescope]
	if p.Telescopes != nil && !contains(p.Telescopes, telescope) {
		return "the program doesn't use this telescope"
	}
	if f.Telescopes != nil && !contains(f.Telescopes, telescope) {
		return "the field doesn't use this telescope"
	}
	for _, x := range p.Demands[demand].Exposures {
		if !contains(t.Filters, x.Filter) {
			return "the telescope has no filter " + j.sv.Filters[x.Filter].Name
		}
	}
	view := t.FieldOfView.Diameter
	if t.FieldOfView.Width > 0 {
		view = math.Min(t.FieldOfView.Width, t.FieldOfView.Height)
	}
	if f.Tile > view {
		return "the field's tile is larger than the field of view"
	}
	return ""
}

func contains(list []int, x int) bool {
	for _, y := range list {
		if x == y {
			return true
		}
	}
	return false
}

// findLoosest works out the highest Sun limit of what each telescope may do.
func (j *Judge) findLoosest() {
	n := len(j.sv.Telescopes)
	j.loosest, j.served = make([]float64, n), make([]bool, n)
	for t := range j.sv.Telescopes {
		for f := range j.sv.Fields {
			rules := j.sv.Fields[f].Rules
			for d := range rules {
				better := !j.served[t] || rules[d].SunAltitudeMax > j.loosest[t]
				if better && j.qualifies(f, d, t) == "" {
					j.loosest[t], j.served[t] = rules[d].SunAltitudeMax, true
				}
			}
		}
	}
}

// wanted is N_f, the visits a field wants over all its demands.
func (j *Judge) wanted(field int) int {
	n := 0
	for _, d := range j.sv.Programs[j.sv.Fields[field].Program].Demands {
		n += d.Visits
	}
	return n
}

// weight is w_f.
func (j *Judge) weight(field int) float64 {
	f := &j.sv.Fields[field]
	return j.sv.Programs[f.Program].Weight * f.Weight
}

// share runs f(0..n-1) on the judge's workers; f must write only what belongs
// to its index.
func (j *Judge) share(ctx context.Context, n int, f func(i int)) error {
	next := make(chan int)
	var wg sync.WaitGroup
	for range min(j.workers, n) {
		wg.Add(1)
		go func() {
			defer wg.Done()
			for i := range next {
				if ctx.Err() == nil {
					f(i)
				}
			}
		}()
	}
	for i := range n {
		next <- i
	}
	close(next)
	wg.Wait()
	if err := ctx.Err(); err != nil {
		return errors.Join(errors.New("audit: stopped before it was done"), err)
	}
	return nil
}
