package outlook

import (
	"cmp"
	"context"
	"slices"
	"strings"

	"nightwright/constraints"
	"nightwright/constraints/survey"
	"nightwright/scheduler/model"
	"nightwright/visibility"
)

// Loss is what one rule takes away, as parts of the time in which the Sun is
// low enough and the field above 0 deg, over fields, demands and telescopes.
type Loss struct {
	Rule  string
	Takes float64 // part in which the rule is broken, maybe with others
	Alone float64 // part in which nothing else is: what would come back without the rule
}

const (
	lossFields = 300  // most fields looked at; of more, every k-th
	lossStep   = 1800 // s between instants
)

// tally counts instants by the rules they break.
type tally struct {
	total        int
	takes, alone [constraints.ReasonCount]int
}

func (y *tally) add(why constraints.Reasons) {
	y.total++
	for i := range constraints.ReasonCount {
		if why&constraints.Reason(i) != 0 {
			y.takes[i]++
			if why == constraints.Reason(i) {
				y.alone[i]++
			}
		}
	}
}

func (y *tally) merge(o *tally) {
	y.total += o.total
	for i := range y.takes {
		y.takes[i] += o.takes[i]
		y.alone[i] += o.alone[i]
	}
}

// losses samples fields and instants of the whole period.
func (in *Input) losses(ctx context.Context) ([]Loss, error) {
	sv := in.Survey
	stride := (len(sv.Fields) + lossFields - 1) / lossFields
	parts := make([]tally, len(sv.Telescopes)*sv.Nights())
	model.Parallel(in.Workers, len(parts), func(i int) {
		if ctx.Err() != nil {
			return
		}
		t, n := i/sv.Nights(), i%sv.Nights()
		in.instants(t, n, func(fr *visibility.Frame) {
			for f := 0; f < len(sv.Fields); f += stride {
				for d := range sv.Programs[sv.Fields[f].Program].Demands {
					if why, up := in.why(f, d, t, fr); up {
						parts[i].add(why)
					}
				}
			}
		})
	})
	if err := ctx.Err(); err != nil {
		return nil, err
	}
	var sum tally
	for i := range parts {
		sum.merge(&parts[i])
	}
	var out []Loss
	for i := range constraints.ReasonCount {
		if sum.takes[i] > 0 {
			all := float64(sum.total)
			out = append(out, Loss{constraints.Reason(i).String(), float64(sum.takes[i]) / all, float64(sum.alone[i]) / all})
		}
	}
	slices.SortStableFunc(out, func(a, b Loss) int { return cmp.Compare(b.Takes, a.Takes) })
	return out, nil
}

// instants calls f for instants of a night in which the Sun is under the
// loosest limit that any demand of a telescope has.
func (in *Input) instants(t, n int, f func(fr *visibility.Frame)) {
	limit, ok := in.Survey.LoosestSun(t)
	if !ok {
		return
	}
	site := in.Survey.Telescopes[t].Site
	below, ok := in.Calendar.SunBelow(site, n, limit)
	if !ok {
		below = in.Exact.SunBelow(constraints.Place(&in.Survey.Sites[site]), in.Calendar.Night(site, n), limit)
	}
	for _, iv := range below {
		for at := iv.From; at < iv.To; at += lossStep {
			fr := in.Sky.Frame(site, at)
			f(&fr)
		}
	}
}

// why returns the rules that a demand breaks at an instant; up is false when
// no telescope question arises: it doesn't qualify, or the field has set.
func (in *Input) why(f, d, t int, fr *visibility.Frame) (why constraints.Reasons, up bool) {
	sv := in.Survey
	fd := &sv.Fields[f]
	dm := &sv.Programs[fd.Program].Demands[d]
	if !sv.Qualifies(fd, dm, t) {
		return 0, false
	}
	for i := range dm.Exposures {
		if i > 0 && dm.Exposures[i].Filter == dm.Exposures[i-1].Filter {
			continue
		}
		s := constraints.SkySight(in.Sky, fr, f, dm.Exposures[i].Filter)
		if s.SinAltitude <= 0 {
			return 0, false
		}
		why |= constraints.Evaluate(sv, f, d, t, &s)
	}
	return why | in.Calendar.Reasons(t, fr.T), true
}

// blocker names what keeps a demand from ever being legal: the rules that are
// broken at every instant of the period, or else the one that is most often.
func (in *Input) blocker(f, d int) string {
	sv := in.Survey
	fd := &sv.Fields[f]
	var y tally
	seen := 0
	for t := range sv.Telescopes {
		if !sv.Qualifies(fd, &sv.Programs[fd.Program].Demands[d], t) {
			continue
		}
		for n := range sv.Nights() {
			in.instants(t, n, func(fr *visibility.Frame) {
				seen++
				if why, up := in.why(f, d, t, fr); up {
					y.add(why)
				}
			})
		}
	}
	switch {
	case seen == 0:
		return constraints.Sun.String() // never dark enough
	case y.total == 0:
		return constraints.Altitude.String() // never above 0 deg
	}
	var always []string
	most := 0
	for i := range constraints.ReasonCount {
		if y.takes[i] == y.total {
			always = append(always, constraints.Reason(i).String())
		}
		if y.takes[i] > y.takes[most] {
			most = i
		}
	}
	if len(always) > 0 {
		return strings.Join(always, ", ")
	}
	return constraints.Reason(most).String()
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
