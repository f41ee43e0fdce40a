package outlook

import (
	"cmp"
	"context"
	"slices"

	"nightwright/constraints"
	"nightwright/constraints/survey"
)

// Loss is what one rule takes away, as parts of the time in which the Sun is
// under a demand's limit and its field above 0 deg, over demands and sites.
type Loss struct {
	Rule    string
	Takes   float64 // part in which the rule is broken, whatever else is
	InOrder float64 // part that falls to it when the rules are gone through in turn; these add up
}

const (
	lossFields = 300 // most fields looked at; of more, every k-th
	// lossStep is the time between instants, s: a prime, so that they don't
	// keep pace with reserved blocks.
	lossStep = 1201
)

// losses samples fields and instants of the whole period; usable is what no
// rule takes.
func (in *Input) losses(ctx context.Context) (losses []Loss, usable float64, err error) {
	sv := in.Survey
	stride := (len(sv.Fields) + lossFields - 1) / lossFields
	var fields []int
	for f := 0; f < len(sv.Fields); f += stride {
		fields = append(fields, f)
	}
	accounts, err := constraints.NewAccounts(ctx, sv, in.Sky, in.Calendar, fields, lossStep, in.Workers)
	if err != nil {
		return nil, 0, err
	}
	var sum constraints.Account
	for _, f := range fields {
		for d := range sv.Programs[sv.Fields[f].Program].Demands {
			a := accounts.Of(f, d)
			sum.Before += a.Before
			sum.Usable += a.Usable
			for i := range a.Alone {
				sum.Alone[i] += a.Alone[i]
				sum.InOrder[i] += a.InOrder[i]
			}
		}
	}
	if sum.Before == 0 {
		return nil, 0, nil
	}
	for i := range sum.Alone {
		if sum.Alone[i] > 0 {
			losses = append(losses, Loss{constraints.Reason(i).String(), sum.Alone[i] / sum.Before, sum.InOrder[i] / sum.Before})
		}
	}
	slices.SortStableFunc(losses, func(a, b Loss) int { return cmp.Compare(b.Takes, a.Takes) })
	return losses, sum.Usable / sum.Before, nil
}

// nameLimits finds the rule that shuts each demand which has none yet: the one
// that takes most of its time when the rules are gone through in turn.
func (in *Input) nameLimits(ctx context.Context, shut []Shut) error {
	var fields []int
	for i := range shut {
		if f := shut[i].Field; shut[i].Limit == "" && (len(fields) == 0 || fields[len(fields)-1] != f) {
			fields = append(fields, f)
		}
	}
	if len(fields) == 0 {
		return nil
	}
	accounts, err := constraints.NewAccounts(ctx, in.Survey, in.Sky, in.Calendar, fields, lossStep, in.Workers)
	if err != nil {
		return err
	}
	for i := range shut {
		x := &shut[i]
		if x.Limit != "" {
			continue
		}
		if why, ok := accounts.Of(x.Field, x.Demand).Greatest(); ok {
			x.Limit = why.String()
		} else if in.dark(x.Field, x.Demand) {
			x.Limit = constraints.Altitude.String() // dark, and never above 0 deg
		} else {
			x.Limit = constraints.Sun.String()
		}
	}
	return nil
}

// dark is true when the Sun ever gets under a demand's limit at a site that
// may serve it.
func (in *Input) dark(f, d int) bool {
	sv := in.Survey
	fd := &sv.Fields[f]
	limit := fd.Rules[d].SunAltitudeMax
	for t := range sv.Telescopes {
		if !sv.Qualifies(fd, &sv.Programs[fd.Program].Demands[d], t) {
			continue
		}
		site := sv.Telescopes[t].Site
		for n := range sv.Nights() {
			below, ok := in.Calendar.SunBelow(site, n, limit)
			if !ok {
				below = in.Exact.SunBelow(constraints.Place(&sv.Sites[site]), in.Calendar.Night(site, n), limit)
			}
			if len(below) > 0 {
				return true
			}
		}
	}
	return false
}

// qualityStep is how finely a field's quality is looked at, s.
const qualityStep = 600

// reachable is true when some instant of a demand's usable time reaches
// min_quality, in each of its filters.
func (in *Input) reachable(f, d int) bool {
	sv := in.Survey
	fd := &sv.Fields[f]
	need := fd.Rules[d].MinQuality
	if need <= 0 {
		return true
	}
	dm := &sv.Programs[fd.Program].Demands[d]
	for t := range sv.Telescopes {
		if !sv.Qualifies(fd, dm, t) {
			continue
		}
		for n := range sv.Nights() {
			for _, iv := range in.usable(f, d, t, n) {
				for at := iv.From; at < iv.To; at += qualityStep {
					if in.good(f, dm, need, sv.Telescopes[t].Site, at) {
						return true
					}
				}
				if in.good(f, dm, need, sv.Telescopes[t].Site, iv.To) {
					return true
				}
			}
		}
	}
	return false
}

func (in *Input) good(f int, dm *survey.Demand, need float64, site int, at float64) bool {
	fr := in.Sky.Frame(site, at)
	c := in.Sky.Direction(f, at)
	for i := range dm.Exposures {
		if in.Sky.Quality(&fr, dm.Exposures[i].Filter, c) < need {
			return false
		}
	}
	return true
}
