package constraints

import "nightwright/constraints/survey"

// Share returns a program's part of all exposure time planned and done, both
// scaled, in s; 0 when there is none.
func Share(own, all float64) float64 {
	if all <= 0 {
		return 0
	}
	return own / all
}

// ShareBreach returns by how much a share lies below share.min (negative) or
// above share.max (positive), once it may be off by one visit of the program:
// visit is the longest of its visits' scaled exposure times, in s. 0 is no
// breach.
func ShareBreach(p *survey.Program, own, all, visit float64) float64 {
	s := Share(own, all)
	// One visit more, or fewer, would be within the bound.
	switch {
	case s < p.ShareMin && Share(own+visit, all+visit) < p.ShareMin:
		return s - p.ShareMin
	case s > p.ShareMax && own > visit && Share(own-visit, all-visit) > p.ShareMax:
		return s - p.ShareMax
	}
	return 0
}
