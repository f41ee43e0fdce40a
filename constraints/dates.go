package constraints

import "nightwright/constraints/survey"

// outsideDates tells whether an instant lies before a field's not_before or
// after its not_after.
func outsideDates(s *Sight, f *survey.Field) bool {
	return s.Unix < f.NotBefore || s.Unix > f.NotAfter
}
