package search

import "nightwright/scheduler/model"

// Stats counts what the search did.
type Stats struct {
	Placed, Better, Undone     int64 // fields taken out and put back
	Inserted, Refused, Ejected int64 // single visits
	Sweeps, Iterated           int64
}

// List gives the counters in a fixed order.
func (s *Stats) List() []model.Stat {
	return []model.Stat{
		{Name: "fields_placed", Value: s.Placed}, {Name: "fields_bettered", Value: s.Better},
		{Name: "fields_undone", Value: s.Undone}, {Name: "visits_inserted", Value: s.Inserted},
		{Name: "visits_refused", Value: s.Refused}, {Name: "visits_ejected", Value: s.Ejected},
		{Name: "sweeps", Value: s.Sweeps}, {Name: "iterations", Value: s.Iterated},
	}
}
