package work

import (
	"context"
	"strconv"
	"strings"

	"nightwright/scheduler/audit"
	"nightwright/scheduler/tables"
)

// Audit checks a plan's visits and totals afresh, from the survey alone and
// the lost time that the plan knew of.
func Audit(ctx context.Context, s *Survey, pt *tables.PlanTables, o Options) (*audit.Report, error) {
	o.tell("audit", 0, 1)
	if err := s.TakeLossesOf(ctx, pt); err != nil {
		return nil, err
	}
	plan := claims(pt)
	var err error
	if plan.Done, err = s.doneClaims(ctx, s.lossesUpTo); err != nil {
		return nil, err
	}
	r, err := audit.Check(ctx, audit.Input{Survey: s.Survey, Losses: s.Losses, Workers: o.Workers, Plan: plan})
	if err != nil {
		return nil, err
	}
	o.tell("audit", 1, 1)
	return r, ctx.Err()
}

// claims says in the audit's own words what a plan's tables claim.
func claims(pt *tables.PlanTables) audit.Plan {
	p := audit.Plan{Totals: totals(pt)}
	for i := range pt.Visits {
		p.Visits = append(p.Visits, audit.Visit(pt.Visits[i]))
	}
	return p
}

func totals(pt *tables.PlanTables) *audit.Totals {
	m := &pt.Summary
	t := &audit.Totals{Score: audit.Score(m.Score), Ceiling: m.Ceiling, Gap: m.Gap, Hours: audit.Hours(m.Hours)}
	for _, x := range m.Programs {
		t.Programs = append(t.Programs, audit.ProgramTotal{
			Program: x.Program, Score: audit.Score(x.Score), ExposureHours: x.ExposureHours, Share: x.Share, ShareBreach: x.ShareBreach,
		})
	}
	for _, x := range m.Sites {
		t.Sites = append(t.Sites, audit.PlaceTotal{Name: x.Site, Visits: x.Visits, Hours: audit.Hours(x.Hours)})
	}
	for _, x := range m.Telescopes {
		t.Telescopes = append(t.Telescopes, audit.PlaceTotal{Name: x.Telescope, Visits: x.Visits, Hours: audit.Hours(x.Hours)})
	}
	for i := range pt.Fields {
		x := &pt.Fields[i]
		t.Fields = append(t.Fields, audit.FieldTotal{
			Field: x.Field, Program: x.Program, Weight: x.Weight, RA: x.RA, Dec: x.Dec, VisitsWanted: x.VisitsWanted, VisitsPlanned: x.VisitsPlanned,
			VisitsDone: x.VisitsDone, Coverage: x.Coverage, Bonus: x.Bonus, First: x.First, Last: x.Last, LongestGap: x.LongestGap,
		})
	}
	for i := range pt.Demands {
		t.Demands = append(t.Demands, audit.DemandTotal(pt.Demands[i]))
	}
	for i := range pt.Nights {
		x := &pt.Nights[i]
		t.Nights = append(t.Nights, audit.NightTotal{
			Site: x.Site, Telescope: x.Telescope, Night: x.Night, DarkHours: x.DarkHours, OpenHours: x.OpenHours, UsedHours: x.UsedHours,
			ExposureHours: x.ExposureHours, Visits: x.Visits, MoonIllumination: x.MoonIllumination,
		})
	}
	return t
}

// BreachLine tells one breach in one line: where, and what is wrong.
func BreachLine(b *audit.Breach) string {
	var where []string
	for _, part := range []string{b.Night, b.Telescope, b.Field} {
		if part != "" {
			where = append(where, part)
		}
	}
	if b.Visit != 0 {
		where = append(where, "visit "+strconv.FormatInt(b.Visit, 10))
	}
	if len(where) == 0 {
		return b.Rule + ": " + b.What
	}
	return strings.Join(where, " ") + ", " + b.Rule + ": " + b.What
}
