package constraints

// On returns the same windows beside another calendar of the same survey, such
// as one with other lost time: windows hold the rules alone, and only what is
// counted in open time (UsableHours) asks the calendar. The nights of both
// must be the same.
func (w *Windows) On(cal *Calendar) *Windows {
	out := *w
	out.calendar = cal
	return &out
}
