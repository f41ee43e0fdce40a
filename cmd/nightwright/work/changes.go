package work

import (
	"cmp"
	"slices"

	"nightwright/scheduler/tables"
)

// Changes says what the trial's plan does to each exposure of the one that
// holds, in order of time. A re-plan says so itself; of other plans the
// exposures of a field and demand are paired in their order.
func (t *Trial) Changes() []tables.ChangeRow {
	rows := slices.Clone(t.After.Changes)
	if rows == nil {
		rows = diff(t.Before.Visits, t.After.Visits)
	}
	at := func(c *tables.ChangeRow) int64 { return max(c.FromStart, c.ToStart) }
	slices.SortStableFunc(rows, func(a, b tables.ChangeRow) int { return cmp.Compare(at(&a), at(&b)) })
	return rows
}

// diff pairs the exposures of two plans: those at the same telescope and
// start are kept, the others of a field, demand and filter moved, what is left
// over dropped or new.
func diff(before, after []tables.VisitRow) []tables.ChangeRow {
	type kind struct{ field, demand, filter string }
	type place struct {
		kind
		telescope string
		start     int64
	}
	placeOf := func(v *tables.VisitRow) place {
		return place{kind{v.Field, v.Demand, v.Filter}, v.Telescope, v.Start}
	}
	there := map[place]bool{}
	for i := range after {
		there[placeOf(&after[i])] = true
	}
	var out []tables.ChangeRow
	gone := map[kind][]*tables.VisitRow{}
	for i := range before {
		v := &before[i]
		p := placeOf(v)
		if !there[p] {
			gone[p.kind] = append(gone[p.kind], v)
			continue
		}
		delete(there, p)
		out = append(out, tables.ChangeRow{Visit: v.Visit, Field: v.Field, What: "kept", FromTelescope: v.Telescope, FromStart: v.Start, ToTelescope: v.Telescope, ToStart: v.Start})
	}
	for i := range after {
		v := &after[i]
		p := placeOf(v)
		if !there[p] {
			continue
		}
		c := tables.ChangeRow{Visit: v.Visit, Field: v.Field, What: "new", ToTelescope: v.Telescope, ToStart: v.Start}
		if old := gone[p.kind]; len(old) > 0 {
			c.What, c.Visit, c.FromTelescope, c.FromStart = "moved", old[0].Visit, old[0].Telescope, old[0].Start
			gone[p.kind] = old[1:]
		}
		out = append(out, c)
	}
	for i := range before { // in the order of the plan, not of the map
		v := &before[i]
		k := placeOf(v).kind
		if old := gone[k]; len(old) > 0 && old[0] == v {
			out = append(out, tables.ChangeRow{Visit: v.Visit, Field: v.Field, What: "dropped", FromTelescope: v.Telescope, FromStart: v.Start})
			gone[k] = old[1:]
		}
	}
	return out
}
