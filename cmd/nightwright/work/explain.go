package work

import (
	"context"

	"nightwright/scheduler/explain"
	"nightwright/scheduler/ledger"
	"nightwright/scheduler/tables"
)

// ExplainField tells why a field is where it is, or isn't, in a plan.
func ExplainField(ctx context.Context, s *Survey, pt *tables.PlanTables, field string, o Options) (*explain.Field, error) {
	f, err := s.FieldID(field)
	if err != nil {
		return nil, err
	}
	in, err := s.explainInput(ctx, pt, o)
	if err != nil {
		return nil, err
	}
	o.tell("field", 0, 1)
	return explain.ForField(ctx, *in, f)
}

// ExplainNight tells why a telescope's night looks as it does in a plan.
func ExplainNight(ctx context.Context, s *Survey, pt *tables.PlanTables, telescope, night string, o Options) (*explain.Night, error) {
	t, err := s.TelescopeID(telescope)
	if err != nil {
		return nil, err
	}
	n, err := s.NightIndex(night)
	if err != nil {
		return nil, err
	}
	in, err := s.explainInput(ctx, pt, o)
	if err != nil {
		return nil, err
	}
	o.tell("night", 0, 1)
	return explain.ForNight(ctx, *in, t, n)
}

// explainInput gathers what explanations need; the lost time is that which the
// plan knew of.
func (s *Survey) explainInput(ctx context.Context, pt *tables.PlanTables, o Options) (*explain.Input, error) {
	if name := pt.Summary.Survey; name != s.Name {
		return nil, Inputf("the plan is of the survey %q, not of %q; want the survey it was made from", name, s.Name)
	}
	if err := s.TakeLossesOf(ctx, pt); err != nil {
		return nil, err
	}
	if err := s.OpenCalendar(ctx, o); err != nil {
		return nil, err
	}
	in := &explain.Input{Survey: s.Survey, Exact: s.Exact, Calendar: s.Calendar, Losses: s.Losses, Plan: pt, Workers: max(1, o.Workers)}
	if r := pt.Summary.Replan; r != nil {
		if us, ok := ledger.ParseInstant(r.Now); ok {
			in.Now = us
		}
	}
	return in, nil
}
