package ledger

import (
	"cmp"
	"slices"

	"nightwright/constraints/survey"
	"nightwright/visibility"
)

// Stretch is lost time of one telescope, [From, To) in UTC Unix seconds, with
// its cause.
type Stretch struct {
	visibility.Interval
	Cause string
}

// LostTime works out what lost time holds of each telescope of a survey, from
// the rows in their order: what was regained is no longer lost, and time that
// was lost twice counts once, for the cause that was told first. Stretches are
// ascending and disjoint. Rows of sites and telescopes that the survey hasn't are
// passed over.
func LostTime(sv *survey.Survey, rows []Loss) [][]Stretch {
	out := make([][]Stretch, len(sv.Telescopes))
	for i := range rows {
		r := &rows[i]
		in := visibility.Interval{From: float64(r.Start) / 1e6, To: float64(r.End) / 1e6}
		for t := range sv.Telescopes {
			tel := &sv.Telescopes[t]
			if sv.Sites[tel.Site].Name != r.Site || r.Telescope != "" && r.Telescope != tel.Name {
				continue
			}
			if r.What == Regained {
				out[t] = without(out[t], in)
			} else {
				out[t] = with(out[t], Stretch{in, r.Cause})
			}
		}
	}
	return out
}

// without takes an interval out of disjoint stretches.
func without(list []Stretch, in visibility.Interval) []Stretch {
	var out []Stretch
	for _, s := range list {
		if in.To <= s.From || in.From >= s.To {
			out = append(out, s)
			continue
		}
		if s.From < in.From {
			out = append(out, Stretch{visibility.Interval{From: s.From, To: in.From}, s.Cause})
		}
		if s.To > in.To {
			out = append(out, Stretch{visibility.Interval{From: in.To, To: s.To}, s.Cause})
		}
	}
	return out
}

// with adds those parts of a stretch that aren't lost yet.
func with(list []Stretch, s Stretch) []Stretch {
	left := []Stretch{s}
	for _, old := range list {
		if old.From < s.To && s.From < old.To {
			left = without(left, old.Interval)
		}
	}
	list = append(list, left...)
	slices.SortFunc(list, func(a, b Stretch) int { return cmp.Compare(a.From, b.From) })
	return list
}

// Intervals leaves the causes off.
func Intervals(lost [][]Stretch) [][]visibility.Interval {
	out := make([][]visibility.Interval, len(lost))
	for t := range lost {
		for _, s := range lost[t] {
			if n := len(out[t]); n > 0 && out[t][n-1].To == s.From {
				out[t][n-1].To = s.To
				continue
			}
			out[t] = append(out[t], s.Interval)
		}
	}
	return out
}
