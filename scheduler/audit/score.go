package audit

import "nightwright/constraints/survey"

// got is what a field has.
type got struct {
	quality       float64 // sum over the visits that count
	planned, done int64
}

// fieldGot sums up the visits that count, by field.
func (c *trial) fieldGot() []got {
	out := make([]got, len(c.j.sv.Fields))
	for i := range c.visits {
		v := &c.visits[i]
		if !v.first().counts {
			continue
		}
		g := &out[v.first().field]
		g.quality += v.quality
		if v.done {
			g.done++
		} else {
			g.planned++
		}
	}
	return out
}

// score recounts what the plan earns from the fields that a condition holds
// for; nil takes all: C = sum w [sum q / N + b (all got)] / ((1 + b) sum w).
func (c *trial) score(holds func(field int) bool) Score {
	var s Score
	b, weight, earned := c.j.sv.FinishBonus, 0.0, 0.0
	for f, g := range c.fieldGot() {
		if holds != nil && !holds(f) {
			continue
		}
		w, wanted := c.j.weight(f), int64(c.j.wanted(f))
		weight += w
		if wanted > 0 {
			earned += w * g.quality / float64(wanted)
		}
		s.VisitsGot += g.planned + g.done
		s.VisitsWanted += wanted
		s.FieldsWanted++
		if g.planned+g.done == wanted {
			s.FieldsFinished++
			earned += w * b
		}
	}
	if weight > 0 {
		s.Coverage = earned / ((1 + b) * weight)
	}
	return s
}

// spent is time by telescope and night, and its sums.
type spent struct {
	nights     [][]NightTotal // by telescope and night
	telescopes []PlaceTotal
	sites      []PlaceTotal
	all        Hours
	exposure   []float64 // by program, in the period, h
}

// hours recounts where the time of telescopes goes.
func (c *trial) hours() spent {
	sv := c.j.sv
	h := spent{
		nights: make([][]NightTotal, len(sv.Telescopes)), telescopes: make([]PlaceTotal, len(sv.Telescopes)),
		sites: make([]PlaceTotal, len(sv.Sites)), exposure: make([]float64, len(sv.Programs)),
	}
	for t := range sv.Telescopes {
		site := sv.Telescopes[t].Site
		h.nights[t] = make([]NightTotal, sv.Nights())
		for n := range h.nights[t] {
			h.nights[t][n] = NightTotal{
				Site: sv.Sites[site].Name, Telescope: sv.Telescopes[t].Name, Night: int32(sv.FirstNight + survey.Day(n)),
				DarkHours: c.j.nights[site][n].dark / 3600, OpenHours: c.j.open[t][n].seconds / 3600,
			}
		}
	}
	for i := range c.shots {
		s := &c.shots[i]
		if !s.known || s.night < 0 {
			continue
		}
		row := &h.nights[s.scope][s.night]
		row.ExposureHours += (s.to - s.from) / 3600
		row.UsedHours += (s.to - s.from + s.gap) / 3600
		h.exposure[sv.Fields[s.field].Program] += (s.to - s.from) / 3600
	}
	for i := range c.visits {
		if s := c.visits[i].first(); s.night >= 0 {
			h.nights[s.scope][s.night].Visits++
		}
	}
	for t := range sv.Telescopes {
		tel, site := &h.telescopes[t], &h.sites[sv.Telescopes[t].Site]
		tel.Name = sv.Telescopes[t].Name
		for n := range h.nights[t] {
			row := &h.nights[t][n]
			for _, sum := range []*Hours{&h.all, &tel.Hours, &site.Hours} {
				sum.Dark += row.DarkHours
				sum.Open += row.OpenHours
				sum.Used += row.UsedHours
				sum.Exposure += row.ExposureHours
			}
			tel.Visits += row.Visits
			site.Visits += row.Visits
		}
	}
	for i := range h.sites {
		h.sites[i].Name = sv.Sites[i].Name
	}
	return h
}
