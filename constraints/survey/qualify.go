package survey

// Qualifies reports whether telescope t may observe demand d of field f: the
// program's and the field's telescope lists, the filters, and the tile.
func (s *Survey) Qualifies(f *Field, d *Demand, t int) bool {
	tel := &s.Telescopes[t]
	if !listed(s.Programs[f.Program].Telescopes, t) || !listed(f.Telescopes, t) {
		return false
	}
	for i := range d.Exposures {
		if !tel.HasFilter(d.Exposures[i].Filter) {
			return false
		}
	}
	return f.Tile == 0 || tel.FieldOfView.Holds(f.Tile)
}

// listed reports whether id is in list; a nil list holds every id.
func listed(list []int, id int) bool {
	if list == nil {
		return true
	}
	for _, x := range list {
		if x == id {
			return true
		}
	}
	return false
}

// Wanted returns N_f, the visits field f wants over all its demands.
func (s *Survey) Wanted(f *Field) int {
	n := 0
	for i := range s.Programs[f.Program].Demands {
		n += s.Programs[f.Program].Demands[i].Visits
	}
	return n
}

// WeightOf returns w_f, program weight times field weight.
func (s *Survey) WeightOf(f *Field) float64 {
	return s.Programs[f.Program].Weight * f.Weight
}

// TotalWeight returns the sum of w_f over all fields.
func (s *Survey) TotalWeight() float64 {
	var sum float64
	for i := range s.Fields {
		sum += s.WeightOf(&s.Fields[i])
	}
	return sum
}

// LoosestSun returns the highest Sun altitude limit (rad) of any demand that
// telescope t may observe, and false when there is none. It bounds the open
// time of the telescope's nights.
func (s *Survey) LoosestSun(t int) (limit float64, ok bool) {
	for i := range s.Fields {
		f := &s.Fields[i]
		demands := s.Programs[f.Program].Demands
		for j := range demands {
			if (!ok || f.Rules[j].SunAltitudeMax > limit) && s.Qualifies(f, &demands[j], t) {
				limit, ok = f.Rules[j].SunAltitudeMax, true
			}
		}
	}
	return limit, ok
}
