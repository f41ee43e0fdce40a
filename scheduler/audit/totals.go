package audit

import (
	"fmt"
	"math"
	"slices"
	"strings"

	"nightwright/constraints/survey"
)

const (
	coverageNear = 1e-9 // of C
	hoursNear    = 0.1 / 3600
	litNear      = 1e-3 // of the Moon's lit fraction
	weightNear   = 1e-12
)

// claim compares what a plan says of itself with what is so.
type claim struct {
	c *trial
	Breach
}

// total notes a total that isn't near what it should be.
func (k claim) total(what string, is, want, near float64, unit string) {
	if math.Abs(is-want) <= near || is == want {
		return
	}
	k.note(RuleTotal, is, want, unit, fmt.Sprintf("%s is %v; it is %v", what, is, want))
}

func (k claim) count(what string, is, want int64) {
	if is != want {
		k.note(RuleTotal, float64(is), float64(want), "", fmt.Sprintf("%s is %d; it is %d", what, is, want))
	}
}

func (k claim) note(rule string, is, want float64, unit, what string) {
	b := k.Breach
	b.Rule, b.Measured, b.Limit, b.Unit, b.What = rule, is, want, unit, what
	k.c.breaches = append(k.c.breaches, b)
}

func (k claim) score(of string, is, want Score) {
	k.total(of+"coverage", is.Coverage, want.Coverage, coverageNear, "")
	k.count(of+"visits got", is.VisitsGot, want.VisitsGot)
	k.count(of+"visits wanted", is.VisitsWanted, want.VisitsWanted)
	k.count(of+"fields finished", is.FieldsFinished, want.FieldsFinished)
	k.count(of+"fields wanted", is.FieldsWanted, want.FieldsWanted)
}

// hours allows each of many nights its error.
func (k claim) hours(of string, is, want Hours, nights int) {
	near := hoursNear * math.Max(1, math.Sqrt(float64(nights)))
	k.total(of+"dark hours", is.Dark, want.Dark, near, "h")
	k.total(of+"open hours", is.Open, want.Open, near, "h")
	k.total(of+"used hours", is.Used, want.Used, near, "h")
	k.total(of+"exposure hours", is.Exposure, want.Exposure, near, "h")
}

// totals judges what the plan claims of itself.
func (c *trial) totals(t *Totals, score Score, h spent) {
	k := claim{c: c}
	k.score("", t.Score, score)
	nights := c.j.sv.Nights()
	k.hours("", t.Hours, h.all, nights*len(c.j.sv.Telescopes))
	if !(t.Ceiling >= score.Coverage-1e-12) {
		k.note(RuleCeiling, t.Ceiling, score.Coverage, "", fmt.Sprintf("the ceiling, %.15g, is below the coverage, %.15g", t.Ceiling, score.Coverage))
	}
	gap := 0.0
	if t.Ceiling != 0 {
		gap = math.Max(0, (t.Ceiling-score.Coverage)/t.Ceiling)
	}
	k.total("gap", t.Gap, gap, coverageNear/math.Max(t.Ceiling, 1e-9), "")
	if t.Programs != nil {
		k.programs(t.Programs, h)
	}
	k.places("site ", t.Sites, h.sites, nights)
	k.places("telescope ", t.Telescopes, h.telescopes, nights)
	k.fields(t.Fields)
	k.demands(t.Demands)
	k.nights(t.Nights, h)
}

// once holds the names of rows against those there are: each once, and all.
// It calls row for each that is known.
func once[T any](k claim, table string, rows []T, name func(*T) string, all []string, row func(*T, int)) {
	if rows == nil {
		return
	}
	at := make(map[string]int, len(all))
	for i, n := range all {
		at[n] = i
	}
	seen := make([]bool, len(all))
	for i := range rows {
		n, ok := at[name(&rows[i])]
		switch {
		case !ok:
			k.note(RuleName, 0, 0, "", fmt.Sprintf("%s: there is no %q", table, plain(name(&rows[i]))))
		case seen[n]:
			k.note(RuleName, 0, 0, "", fmt.Sprintf("%s: %q is there twice", table, plain(all[n])))
		default:
			seen[n] = true
			row(&rows[i], n)
		}
	}
	for n, ok := range seen {
		if !ok {
			k.note(RuleName, 0, 0, "", fmt.Sprintf("%s: %q is missing", table, plain(all[n])))
		}
	}
}

// joint keeps the parts of a key apart.
const joint = "\x00"

// plain is a key as people read it.
func plain(key string) string { return strings.ReplaceAll(key, joint, ", ") }

func (k claim) places(kind string, rows, want []PlaceTotal, nights int) {
	names := make([]string, len(want))
	for i := range want {
		names[i] = want[i].Name
	}
	once(k, kind+"totals", rows, func(r *PlaceTotal) string { return r.Name }, names, func(r *PlaceTotal, i int) {
		k.count(kind+r.Name+": visits", r.Visits, want[i].Visits)
		k.hours(kind+r.Name+": ", r.Hours, want[i].Hours, nights)
	})
}

func (k claim) programs(rows []ProgramTotal, h spent) {
	sv := k.c.j.sv
	names := make([]string, len(sv.Programs))
	all := 0.0
	for i := range names {
		names[i] = sv.Programs[i].Name
		all += h.exposure[i]
	}
	once(k, "program totals", rows, func(r *ProgramTotal) string { return r.Program }, names, func(r *ProgramTotal, i int) {
		of := "program " + r.Program + ": "
		k.score(of, r.Score, k.c.score(func(f int) bool { return sv.Fields[f].Program == i }))
		k.total(of+"exposure hours", r.ExposureHours, h.exposure[i], hoursNear, "h")
		share := 0.0
		if all > 0 {
			share = h.exposure[i] / all
		}
		k.total(of+"share", r.Share, share, ratioNear, "")
		k.share(&sv.Programs[i], r.ShareBreach, h.exposure[i], all, k.c.longestVisit(i)/3600)
	})
}

// share judges a program's bounds: they hold, or they don't and the plan says
// by how much. Within one visit of a bound either will do.
func (k claim) share(p *survey.Program, told, own, all, visit float64) {
	share := 0.0
	if all > 0 {
		share = own / all
	}
	off := math.Max(0, math.Max(p.ShareMin-share, share-p.ShareMax))
	// One visit more (or one fewer), by both ways to read that: it comes on
	// top of all time, or takes the place of another's.
	more := math.Max((own+visit)/(all+visit), (own+visit)/math.Max(all, 1e-12))
	fewer := math.Min((own-visit)/math.Max(all-visit, 1e-12), (own-visit)/math.Max(all, 1e-12))
	surely := more < p.ShareMin-ratioSlack || fewer > p.ShareMax+ratioSlack
	what := ""
	switch is := math.Abs(told); {
	case off <= ratioNear && !(is <= ratioNear):
		what = "share_breach is told, and the share is within its bounds"
	case !(is <= ratioNear) && !(math.Abs(is-off) <= ratioNear):
		what = "share_breach is not how far the share is out of its bounds"
	case surely && is <= ratioNear && off > ratioNear:
		what = "the share is out of its bounds by more than one visit, and share_breach doesn't say so"
	default:
		return
	}
	k.note(RuleShare, told, off, "", fmt.Sprintf("program %s: %s (share %.6f, bounds %g to %g)", p.Name, what, share, p.ShareMin, p.ShareMax))
}

// longestVisit is the longest scaled exposure time of a program's visits on
// any telescope that may take them, s.
func (c *trial) longestVisit(program int) float64 {
	longest := 0.0
	for d, demand := range c.j.sv.Programs[program].Demands {
		for t := range c.j.sv.Telescopes {
			takes := 0.0
			for _, x := range demand.Exposures {
				takes += x.Duration * c.j.sv.Telescopes[t].ExposureScale
			}
			if takes <= longest {
				continue
			}
			if slices.ContainsFunc(c.j.programFields(program), func(f int) bool { return c.j.qualifies(f, d, t) == "" }) {
				longest = takes
			}
		}
	}
	return longest
}

func (j *Judge) programFields(program int) []int {
	var out []int
	for f := range j.sv.Fields {
		if j.sv.Fields[f].Program == program {
			out = append(out, f)
		}
	}
	return out
}
