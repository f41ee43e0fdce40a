package work

import (
	"context"
	"fmt"

	"nightwright/scenarios/surveyfile"
	"nightwright/scheduler/outlook"
)

// CheckResult is what a check finds of a survey without faults. Hours are of
// telescope time.
type CheckResult struct {
	Survey         string         `json:"survey"`
	FirstNight     string         `json:"first_night"`
	LastNight      string         `json:"last_night"`
	Nights         int            `json:"nights"`
	Fields         int            `json:"fields"`
	Programs       []CheckProgram `json:"programs"`
	VisitsWanted   int            `json:"visits_wanted"`
	HoursAsked     float64        `json:"hours_asked"`
	HoursOpen      float64        `json:"hours_open"` // less keep_free
	Telescopes     []CheckScope   `json:"telescopes"`
	Ascension      []CheckBin     `json:"right_ascension"`
	Months         []CheckMonth   `json:"months"`
	Rules          []CheckRule    `json:"rules"`
	Usable         float64        `json:"usable"` // what the rules leave of the same time
	Shut           []CheckShut    `json:"never_open"`
	Short          []CheckShort   `json:"too_short"`
	FieldsShort    int            `json:"fields_that_cannot_finish"`
	Defaults       []CheckDefault `json:"defaults"`
	Warnings       []string       `json:"warnings"`
	MemoryEstimate int64          `json:"windows_bytes"`
}

// CheckProgram is one program's demand.
type CheckProgram struct {
	Program string `json:"program"`
	Fields  int    `json:"fields"`
	Visits  int    `json:"visits_wanted"`
}

// CheckScope is one telescope's hours in the period.
type CheckScope struct {
	Site      string  `json:"site"`
	Telescope string  `json:"telescope"`
	Dark      float64 `json:"dark_hours"`
	Open      float64 `json:"open_hours"`
	Free      float64 `json:"plannable_hours"` // open, less keep_free
}

// CheckBin is demand against supply in two hours of right ascension.
type CheckBin struct {
	From  int     `json:"from_h"`
	To    int     `json:"to_h"`
	Asked float64 `json:"hours_asked"`
	Open  float64 `json:"hours_open"` // with that right ascension on the meridian
	Seen  float64 `json:"hours_seen"` // in which a field there can be observed, over all sites
}

// CheckMonth is demand against supply in a month.
type CheckMonth struct {
	Month string  `json:"month"`
	Asked float64 `json:"hours_asked"` // each demand's hours spread over its usable time
	Open  float64 `json:"hours_open"`
}

// CheckRule is what a rule takes away.
type CheckRule struct {
	Rule    string  `json:"rule"`
	Takes   float64 `json:"takes"`    // part of the time in which it is broken
	InOrder float64 `json:"in_order"` // part that falls to it, rule by rule in turn
}

// CheckShut is a demand that no window opens for.
type CheckShut struct {
	Field  string `json:"field"`
	Demand string `json:"demand"`
	Limit  string `json:"limited_by"`
}

// CheckShort is a demand that can't get all its visits.
type CheckShort struct {
	Field  string `json:"field"`
	Demand string `json:"demand"`
	Wanted int    `json:"wanted"`
	Most   int    `json:"most"`
	Limit  string `json:"limited_by"`
}

// CheckDefault is what holds for a key when it is left out.
type CheckDefault struct {
	Key     string `json:"key"`
	Default string `json:"default"`
	About   string `json:"about"`
}

// Check validates a survey and weighs what it asks for against what its sites
// have.
func Check(ctx context.Context, s *Survey, o Options) (*CheckResult, error) {
	if err := s.OpenWindows(ctx, o); err != nil {
		return nil, err
	}
	o.tell("outlook", 0, 1)
	r, err := outlook.Look(ctx, outlook.Input{
		Survey: s.Survey, Exact: s.Exact, Sky: s.Sky, Calendar: s.Calendar, Windows: s.Windows, Workers: o.Workers,
	})
	if err != nil {
		return nil, err
	}
	o.tell("outlook", 1, 1)
	c := &CheckResult{
		Survey: s.Name, FirstNight: s.FirstNight.String(), LastNight: s.LastNight.String(), Nights: s.Nights(),
		Fields: len(s.Fields), HoursAsked: r.Asked, HoursOpen: r.Open, FieldsShort: r.ShortField,
		MemoryEstimate: s.Windows.Bytes(),
	}
	s.describe(c)
	c.balance(r)
	c.impossible(s, r)
	for _, d := range surveyfile.Defaults() {
		c.Defaults = append(c.Defaults, CheckDefault{d.Name(), d.Default, d.About})
	}
	c.Warnings = s.AllWarnings()
	return c, nil
}

// describe fills in the survey's own sizes.
func (s *Survey) describe(c *CheckResult) {
	c.Programs = make([]CheckProgram, len(s.Programs))
	for p := range s.Programs {
		c.Programs[p].Program = s.Programs[p].Name
	}
	for f := range s.Fields {
		p := &c.Programs[s.Fields[f].Program]
		n := s.Wanted(&s.Fields[f])
		p.Fields++
		p.Visits += n
		c.VisitsWanted += n
	}
}

// balance fills in demand against supply and the rules.
func (c *CheckResult) balance(r *outlook.Report) {
	for b, x := range r.Ascension {
		c.Ascension = append(c.Ascension, CheckBin{24 / outlook.Bins * b, 24 / outlook.Bins * (b + 1), x.Asked, x.Open, x.Seen})
	}
	for _, m := range r.Months {
		c.Months = append(c.Months, CheckMonth{fmt.Sprintf("%04d-%02d", m.Year, m.Month), m.Asked, m.Open})
	}
	c.Rules, c.Usable = []CheckRule{}, r.Usable
	for _, l := range r.Losses {
		c.Rules = append(c.Rules, CheckRule{l.Rule, l.Takes, l.InOrder})
	}
}

// impossible fills in telescopes' hours and what can't be done.
func (c *CheckResult) impossible(s *Survey, r *outlook.Report) {
	for t, h := range r.Telescopes {
		tel := &s.Telescopes[t]
		c.Telescopes = append(c.Telescopes, CheckScope{s.Sites[tel.Site].Name, tel.Name, h.Dark, h.Open, h.Free})
	}
	names := func(f, d int) (field, demand string) {
		fd := &s.Fields[f]
		return fd.Name, s.Programs[fd.Program].Demands[d].Name
	}
	c.Shut, c.Short = []CheckShut{}, []CheckShort{}
	for _, x := range r.Shut {
		f, d := names(x.Field, x.Demand)
		c.Shut = append(c.Shut, CheckShut{f, d, x.Limit})
	}
	for _, x := range r.Short {
		f, d := names(x.Field, x.Demand)
		c.Short = append(c.Short, CheckShort{f, d, x.Wanted, x.Most, x.Limit})
	}
}

// AllWarnings lists what is suspicious, a line each.
func (s *Survey) AllWarnings() []string {
	out := []string{}
	for i := range s.Warnings {
		out = append(out, s.Warnings[i].String())
	}
	if w := s.LeapWarning(); w != "" {
		out = append(out, "warning: "+w)
	}
	return out
}
