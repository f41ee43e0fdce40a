package ledger

import (
	"cmp"
	"math"
	"slices"

	"nightwright/constraints/survey"
	"nightwright/visibility"
)

// Planned is one exposure of a plan, as far as following it goes.
type Planned struct {
	Program, Site, Telescope string
	Night                    survey.Day
	Start                    int64 // UTC, Unix microseconds
	Set                      int64 // groups the exposures of one visit; 0: it is one by itself
	Credit                   float64
}

// Tally holds what was done against what was planned, up to an instant.
type Tally struct {
	Planned       int     `json:"visits_planned"` // started by then; a set counts once
	Done          int     `json:"visits_done"`    // that count
	PlannedCredit float64 `json:"credit_planned"` // part of coverage, bonus apart
	DoneCredit    float64 `json:"credit_done"`
}

// Behind is how many visits are missing; below 0: ahead.
func (t Tally) Behind() int { return t.Planned - t.Done }

// ProgramTrack is one program's tally.
type ProgramTrack struct {
	Program string `json:"program"`
	Wanted  int    `json:"visits_wanted"` // in all
	Tally
}

// PlaceTrack is one telescope's tally, and its lost time.
type PlaceTrack struct {
	Site      string `json:"site"`
	Telescope string `json:"telescope"`
	Tally
	OpenHours float64     `json:"open_hours"` // that the nights had by then, lost ones among them
	Lost      []LostCause `json:"lost"`       // one a cause, in the order of Causes
}

// LostCause is what one cause took.
type LostCause struct {
	Cause  string  `json:"cause"`
	Hours  float64 `json:"hours"`          // of open time
	Visits int     `json:"visits_planned"` // planned visits that began in it
}

// NightTrack is one night over all telescopes.
type NightTrack struct {
	Night     survey.Day `json:"-"`
	Label     string     `json:"night"`
	Planned   int        `json:"visits_planned"`
	Done      int        `json:"visits_done"`
	OpenHours float64    `json:"open_hours"`
	LostHours float64    `json:"lost_hours"`
}

// Track says whether a survey is on track.
type Track struct {
	Until    int64 // UTC, Unix microseconds
	Wanted   int   // visits, in all
	Compared bool  // there is a plan to compare with
	All      Tally
	Programs []ProgramTrack
	Places   []PlaceTrack // by telescope, in the survey's order
	Nights   []NightTrack // of the period, up to Until
	Below    int          // visits with an exposure under min_quality: on record, and count for nothing
	Broken   int          // sets that aren't whole
	Surplus  int          // sound visits that nobody wanted any more
	Strange  int          // exposures that belong to no demand
	Before   int          // visits of those that count, from before the period
}

// Holdings is what Follow looks at.
type Holdings struct {
	Survey  *survey.Survey
	Done    []Exposure
	Credits *Credits
	Lost    [][]Stretch // of each telescope
	// Open tells when a telescope is open in a night of the period (index),
	// without regard to losses.
	Open    func(telescope, night int) []visibility.Interval
	Planned []Planned // nil: there is no plan
}

// follower fills a track.
type follower struct {
	*Holdings
	Track
	program, place map[string]int
}

// Follow compares what was done and lost until an instant (UTC, Unix
// microseconds) with what was planned until then.
func Follow(h Holdings, until int64) *Track {
	f := &follower{Holdings: &h, program: map[string]int{}, place: map[string]int{}}
	sv := h.Survey
	f.Until, f.Compared = until, h.Planned != nil
	for i := range sv.Programs {
		f.program[sv.Programs[i].Name] = i
		f.Programs = append(f.Programs, ProgramTrack{Program: sv.Programs[i].Name})
	}
	for i := range sv.Fields {
		n := sv.Wanted(&sv.Fields[i])
		f.Wanted += n
		f.Programs[sv.Fields[i].Program].Wanted += n
	}
	for i := range sv.Telescopes {
		t := &sv.Telescopes[i]
		f.place[t.Name] = i
		p := PlaceTrack{Site: sv.Sites[t.Site].Name, Telescope: t.Name}
		for _, c := range Causes() {
			p.Lost = append(p.Lost, LostCause{Cause: c})
		}
		f.Places = append(f.Places, p)
	}
	f.time()
	f.done()
	f.planned()
	for i := range f.Nights {
		f.Nights[i].Label = f.Nights[i].Night.String()
	}
	return &f.Track
}

// time counts open and lost hours, and makes the list of nights.
func (f *follower) time() {
	sv, until := f.Survey, float64(f.Until)/1e6
	for n := range sv.Nights() {
		night := NightTrack{Night: sv.FirstNight + survey.Day(n)}
		begun := false
		for t := range sv.Telescopes {
			for _, o := range f.Open(t, n) {
				o.To = math.Min(o.To, until)
				if o.To <= o.From {
					continue
				}
				begun = true
				f.Places[t].OpenHours += (o.To - o.From) / 3600
				night.OpenHours += (o.To - o.From) / 3600
				for _, s := range f.Lost[t] {
					if both := math.Min(s.To, o.To) - math.Max(s.From, o.From); both > 0 {
						f.Places[t].Lost[slices.Index(Causes(), s.Cause)].Hours += both / 3600
						night.LostHours += both / 3600
					}
				}
			}
		}
		if begun {
			f.Nights = append(f.Nights, night)
		}
	}
}

// night returns the row of a night, or nil outside of the nights begun.
func (f *follower) night(d survey.Day) *NightTrack {
	i, ok := slices.BinarySearchFunc(f.Nights, d, func(n NightTrack, d survey.Day) int { return cmp.Compare(n.Night, d) })
	if !ok {
		return nil
	}
	return &f.Nights[i]
}

// done counts what was done.
func (f *follower) done() {
	sv := f.Survey
	total := sv.TotalWeight()
	for _, i := range f.Credits.Strangers {
		if f.Done[i].Start < f.Until {
			f.Strange++
		}
	}
	for i := range f.Credits.Visits {
		v := &f.Credits.Visits[i]
		switch {
		case v.Start >= f.Until:
			continue
		case !v.Whole:
			f.Broken++
			continue
		case !v.Sound:
			f.Below++
			continue
		case !v.Counts:
			f.Surplus++
			continue
		}
		fd := &sv.Fields[v.Field]
		credit := sv.WeightOf(fd) * v.Quality / (float64(sv.Wanted(fd)) * (1 + sv.FinishBonus) * total)
		tallies := []*Tally{&f.All, &f.Programs[fd.Program].Tally}
		if v.Telescope >= 0 {
			tallies = append(tallies, &f.Places[v.Telescope].Tally)
		}
		for _, t := range tallies {
			t.Done++
			t.DoneCredit += credit
		}
		if n := f.night(v.Night); n != nil {
			n.Done++
		} else if v.Night < sv.FirstNight {
			f.Before++
		}
	}
}

// planned counts what the plan wanted by then.
func (f *follower) planned() {
	sets := map[int64]bool{}
	for i := range f.Planned {
		p := &f.Planned[i]
		if p.Start >= f.Until {
			continue
		}
		one := 1
		if p.Set != 0 && sets[p.Set] {
			one = 0
		}
		sets[p.Set] = true
		count := func(t *Tally) { t.Planned += one; t.PlannedCredit += p.Credit }
		count(&f.All)
		if i, ok := f.program[p.Program]; ok {
			count(&f.Programs[i].Tally)
		}
		if n := f.night(p.Night); n != nil {
			n.Planned += one
		}
		t, ok := f.place[p.Telescope]
		if !ok {
			continue
		}
		count(&f.Places[t].Tally)
		at := float64(p.Start) / 1e6
		for _, s := range f.Lost[t] {
			if s.From <= at && at < s.To {
				f.Places[t].Lost[slices.Index(Causes(), s.Cause)].Visits += one
			}
		}
	}
}
