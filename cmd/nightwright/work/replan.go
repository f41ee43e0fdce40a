package work

import (
	"context"
	"math"
	"path/filepath"
	"slices"
	"time"

	"nightwright/scheduler"
	"nightwright/scheduler/audit"
	"nightwright/scheduler/ledger"
	"nightwright/scheduler/tables"
)

// ReplanAsk says how to plan the rest of a season again.
type ReplanAsk struct {
	Plan      string        // folder of the plan to start from
	Now       string        // instant before which nothing is planned any more
	Hold      time.Duration // nothing within it moves
	Stability float64       // 0 to 1
	Frontier  bool
	Out       string // "": a new folder beside the survey, named after Now
}

// ReplanResult is a re-plan that passed its audit and was written.
type ReplanResult struct {
	Folder     string
	Tables     *tables.PlanTables
	Audit      *audit.Report
	Earlier    tables.Summary
	Changes    []string // how the survey differs from that of the earlier plan
	Homeless   int      // exposures done by telescopes that the survey has no more
	Left       int      // planned exposures of what the survey has no more
	HeldLost   []HeldLost
	Moves      []ScopeMoves
	Frontier   []scheduler.FrontierPoint
	Shifted    int // kept visits with another start
	Unrecorded error
}

// HeldLost is an exposure inside the hold that can't be taken.
type HeldLost struct {
	Field, Telescope, Why string
	Start                 int64 // UTC, Unix us
}

// ScopeMoves counts a telescope's exposures that left it and came to it.
type ScopeMoves struct {
	Telescope                             string
	Lost, MovedAway, Dropped, Here, Fresh int
}

// Replan plans the rest of a season again from the ledger and an earlier plan,
// audits it and writes a plan folder.
func Replan(ctx context.Context, s *Survey, ask ReplanAsk, o Options) (*ReplanResult, error) {
	now, err := ParseInstant("--now", ask.Now)
	if err != nil {
		return nil, err
	}
	if ask.Out == "" {
		ask.Out = filepath.Join(s.Folder(), "plan-"+time.Unix(int64(now), 0).UTC().Format("20060102T1504Z"))
	}
	if err := plannable(ask.Out); err != nil {
		return nil, err
	}
	o.tell("plan", 0, 1)
	pt, err := ReadPlan(ask.Plan)
	if err != nil {
		return nil, err
	}
	if name := pt.Summary.Survey; name != s.Name {
		return nil, Inputf("the plan in %s is of the survey %q, not of %q; want a plan of this survey", ask.Plan, name, s.Name)
	}
	r := &ReplanResult{Folder: ask.Out, Earlier: pt.Summary, Changes: s.Differences(ask.Plan, pt)}
	knew, err := s.TakeLosses(ctx, ledger.Now)
	if err != nil {
		return nil, err
	}
	h, err := s.history(ctx, knew)
	if err != nil {
		return nil, err
	}
	h.From = int64(math.Round(now * 1e6))
	if err := s.inTime(h, ask.Now); err != nil {
		return nil, err
	}
	r.Homeless = h.Homeless
	if err := s.OpenWindows(ctx, o); err != nil {
		return nil, err
	}
	old, left := s.earlier(pt, h)
	r.Left = len(left)
	out, err := scheduler.Replan(ctx, scheduler.Input{
		Survey: s.Survey, Sky: s.Sky, Calendar: s.Calendar, Windows: s.Windows, Workers: o.Workers, Past: &h.Past,
	}, old, scheduler.ReplanParams{
		Hold: ask.Hold.Microseconds(), Stability: ask.Stability, Frontier: ask.Frontier, Seed: pt.Summary.Seed, Progress: o.Progress,
	})
	if err == nil {
		err = ctx.Err()
	}
	if err != nil {
		return nil, err
	}
	r.Frontier, r.Shifted = out.Frontier, out.Tally.Shifted
	if r.Tables, err = s.replanTables(ctx, out, pt, ask, h, left, o); err != nil {
		return nil, err
	}
	r.tellMoves(s, out, h.From, h.From+ask.Hold.Microseconds())
	return r, s.installReplan(ctx, r, knew, o)
}

// inTime refuses a clock that contradicts the ledger, or leaves nothing to plan.
func (s *Survey) inTime(h *History, now string) error {
	if h.From < h.Last {
		return Inputf("--now %s lies before %s, when the last recorded exposure ended; want the present time: a clock in the past would plan what is over", now, ledger.Instant(h.Last))
	}
	end := int64(math.MinInt64)
	for i := range s.Sites {
		end = max(end, int64((s.LastNight+1).Unix()*1e6)+int64(43200e6)-int64(s.Sites[i].Longitude/(2*math.Pi)*86400e6))
	}
	if h.From >= end {
		return Inputf("--now %s lies after the survey's last night, %s; there is nothing left to plan", now, s.LastNight)
	}
	return nil
}

// replanTables turns the outcome into a plan's tables.
func (s *Survey) replanTables(ctx context.Context, out *scheduler.Replanned, old *tables.PlanTables, ask ReplanAsk, h *History, left []tables.ChangeRow, o Options) (*tables.PlanTables, error) {
	o.tell("recount", 0, 1)
	pt, err := tables.Build(ctx, s.Survey, s.Exact, s.Calendar, s.Windows, out.Outcome, o.Workers)
	if err != nil {
		return nil, err
	}
	pt.Summary.Program = o.Version
	sum, err := planSum(old)
	if err != nil {
		return nil, err
	}
	t := &out.Tally
	pt.Summary.Replan = &tables.Replan{
		Now: ledger.Instant(h.From), HoldHours: ask.Hold.Hours(), Stability: ask.Stability, From: sum,
		CeilingHeld: max(out.CeilingHeld, pt.Summary.Coverage), Before: out.Before,
		VisitsDone: t.Done, VisitsHeld: t.Held, VisitsKept: t.Kept, VisitsLost: t.Lost, VisitsMoved: t.Moved, VisitsDropped: t.Dropped, VisitsNew: t.New,
		CreditLost: t.LostC, CreditWon: t.WonC,
	}
	pt.Changes = append([]tables.ChangeRow{}, left...)
	name := func(t int32) string {
		if t < 0 {
			return ""
		}
		return s.Telescopes[t].Name
	}
	for i := range out.Changes {
		c := &out.Changes[i]
		pt.Changes = append(pt.Changes, tables.ChangeRow{
			Visit: c.Visit, Field: s.Fields[c.Field].Name, What: string(c.What),
			FromTelescope: name(c.FromTelescope), FromStart: c.FromStart, ToTelescope: name(c.ToTelescope), ToStart: c.ToStart,
		})
	}
	tables.Changes.Sort(pt.Changes)
	return pt, nil
}

// installReplan audits a re-plan, writes its folder and notes it in the ledger.
func (s *Survey) installReplan(ctx context.Context, r *ReplanResult, knew int64, o Options) error {
	var err error
	if r.Audit, err = Audit(ctx, s, r.Tables, o); err != nil {
		return err
	}
	if len(r.Audit.Breaches) > 0 {
		return &BreachError{r.Audit}
	}
	files, err := s.files()
	if err != nil {
		return err
	}
	if err := ctx.Err(); err != nil { // the last moment to turn back
		return err
	}
	if err := tables.WriteFolder(r.Folder, r.Tables, files); err != nil {
		return err
	}
	r.Unrecorded = s.enterPlan(ctx, r.Folder, r.Tables, knew, o)
	return nil
}

// tellMoves sums the changes up by telescope, and lists what the hold lost.
func (r *ReplanResult) tellMoves(s *Survey, out *scheduler.Replanned, from, until int64) {
	rows := make([]ScopeMoves, len(s.Telescopes))
	for t := range rows {
		rows[t].Telescope = s.Telescopes[t].Name
	}
	for i := range out.Changes {
		c := &out.Changes[i]
		switch c.What {
		case scheduler.Lost:
			rows[c.FromTelescope].Lost++
			if c.FromStart >= from && c.FromStart < until {
				r.HeldLost = append(r.HeldLost, HeldLost{s.Fields[c.Field].Name, s.Telescopes[c.FromTelescope].Name, string(c.Why), c.FromStart})
			}
		case scheduler.Dropped:
			rows[c.FromTelescope].Dropped++
		case scheduler.Moved:
			rows[c.FromTelescope].MovedAway++
			rows[c.ToTelescope].Here++
		case scheduler.New:
			rows[c.ToTelescope].Fresh++
		}
	}
	r.Moves = slices.DeleteFunc(rows, func(m ScopeMoves) bool { return m.Lost+m.MovedAway+m.Dropped+m.Here+m.Fresh == 0 })
}
