package work

import (
	"context"
	"math"
	"time"

	"nightwright/constraints"
	"nightwright/constraints/survey"
	"nightwright/scheduler/model"
	"nightwright/scheduler/tables"
	"nightwright/visibility"
)

// GridAsk says which part of the time-slot grid is wanted.
type GridAsk struct {
	Sites, Fields []string      // none: all
	Nights        []string      // labels; none: the whole period, unless From and To are given
	From, To      string        // instants, ISO 8601 with Z; both or neither
	Step          time.Duration // 0: the survey's slot
	Filter        string        // of sky_mag_arcsec2; "": the survey's first
}

// MaxGridRows is the most rows of one grid; more wouldn't fit into memory.
const MaxGridRows = 5_000_000

// stretch is a run of instants from+k*step, before to.
type stretch struct {
	from, step float64
	n          int
}

// Grid works out the time-slot grid: the geometry of each field over each
// site at each slot's start, and what blocks it there.
func Grid(ctx context.Context, s *Survey, ask GridAsk, o Options) ([]tables.GridRow, error) {
	sites, err := s.pickSites(ask.Sites)
	if err != nil {
		return nil, err
	}
	fields, err := s.pickFields(ask.Fields)
	if err != nil {
		return nil, err
	}
	filter := 0
	if ask.Filter != "" {
		if filter, err = s.FilterID(ask.Filter); err != nil {
			return nil, err
		}
	}
	if err := s.OpenCalendar(ctx, o); err != nil {
		return nil, err
	}
	bySite := make([][]float64, len(sites))
	total := 0
	first, last := math.Inf(1), math.Inf(-1)
	for i, site := range sites {
		runs, err := s.stretches(site, ask)
		if err != nil {
			return nil, err
		}
		for _, r := range runs {
			if total += r.n * len(fields); total > MaxGridRows {
				return nil, Inputf("this grid has more than %d rows; ask for less with --site, --field, --night or --from and --to, or for a longer --step", MaxGridRows)
			}
			for k := range r.n {
				bySite[i] = append(bySite[i], r.from+float64(k)*r.step)
			}
		}
		for _, t := range bySite[i] {
			first, last = math.Min(first, t), math.Max(last, t)
		}
	}
	if total == 0 {
		return []tables.GridRow{}, nil
	}
	sky := visibility.NewSky(s.Exact, constraints.Sites(s.Survey), s.Filters, constraints.Positions(s.Survey), first, last+1, o.Workers)
	g := gridJob{s: s, sky: sky, filter: filter, rows: make([]tables.GridRow, total)}
	if err := g.fill(ctx, sites, fields, bySite, o); err != nil {
		return nil, err
	}
	tables.Grid.Sort(g.rows)
	return g.rows, nil
}

// stretches lists the instants of a site's grid.
func (s *Survey) stretches(site int, ask GridAsk) ([]stretch, error) {
	step := s.Slot
	if ask.Step != 0 {
		if step = ask.Step.Seconds(); step < 1 {
			return nil, Inputf("--step is %v; want 1s or more", ask.Step)
		}
	}
	if ask.From != "" || ask.To != "" {
		if len(ask.Nights) > 0 {
			return nil, Inputf("--night and --from/--to were both given; want one of them")
		}
		from, err := ParseInstant("--from", ask.From)
		if err != nil {
			return nil, err
		}
		to, err := ParseInstant("--to", ask.To)
		if err != nil {
			return nil, err
		}
		if !(to > from) {
			return nil, Inputf("--to %s is not after --from %s", ask.To, ask.From)
		}
		if ask.Step == 0 { // slots
			from = math.Ceil(from/step) * step
		}
		return []stretch{{from, step, steps(from, to, step)}}, nil
	}
	nights, err := s.pickNights(ask.Nights)
	if err != nil {
		return nil, err
	}
	var runs []stretch
	for _, n := range nights {
		iv := s.Calendar.Night(site, n)
		from := math.Ceil(iv.From/step) * step
		runs = append(runs, stretch{from, step, steps(from, iv.To, step)})
	}
	return runs, nil
}

// steps counts the instants from+k*step before to.
func steps(from, to, step float64) int { return max(0, int(math.Ceil((to-from)/step))) }

// pickNights turns labels into indices from the first night; none: all.
func (s *Survey) pickNights(labels []string) ([]int, error) {
	return pick(s.Nights(), labels, func(label string) (int, error) { return s.NightIndex(label) })
}

// NightIndex turns a night label into its index from the first night.
func (s *Survey) NightIndex(label string) (int, error) {
	day, err := survey.ParseDay(label)
	if err != nil {
		return 0, Inputf("night: %v", err)
	}
	if day < s.FirstNight || day > s.LastNight {
		return 0, Inputf("night %s is outside the survey's period; want %s to %s", day, s.FirstNight, s.LastNight)
	}
	return int(day - s.FirstNight), nil
}

// ParseInstant reads an instant, ISO 8601 with Z; name stands in the error.
func ParseInstant(name, text string) (float64, error) {
	t, err := time.Parse(time.RFC3339Nano, text)
	if err != nil || t.Location() != time.UTC {
		return 0, Inputf("%s is %q; want UTC such as 2027-02-01T03:00:00Z", name, text)
	}
	return float64(t.Unix()) + float64(t.Nanosecond())*1e-9, nil
}

// gridJob fills the rows of a grid.
type gridJob struct {
	s      *Survey
	sky    *visibility.Sky
	filter int
	rows   []tables.GridRow
}

// fill works out all rows: site by site, instants in parallel, so that what
// all fields share is worked out once an instant.
func (g *gridJob) fill(ctx context.Context, sites, fields []int, instants [][]float64, o Options) error {
	at := 0
	for i, site := range sites {
		times := instants[i]
		base := at
		model.Parallel(o.Workers, len(times), func(k int) {
			if ctx.Err() != nil {
				return
			}
			fr := g.sky.Frame(site, times[k])
			phase := g.s.Exact.Moon(constraints.Place(&g.s.Sites[site]), times[k]).PhaseAngle
			for j, f := range fields {
				g.rows[base+j*len(times)+k] = g.row(site, f, &fr, phase)
			}
		})
		at += len(times) * len(fields)
		o.tell("grid", i+1, len(sites))
	}
	return ctx.Err()
}

func (g *gridJob) row(site, field int, fr *visibility.Frame, phase float64) tables.GridRow {
	s := constraints.SkySight(g.sky, fr, field, g.filter)
	row := tables.GridRow{
		Site: g.s.Sites[site].Name, Field: g.s.Fields[field].Name, SlotStart: micros(fr.T),
		Altitude: deg(s.Altitude), Azimuth: deg(s.Azimuth), SunAltitude: deg(s.SunAltitude),
		MoonAltitude: deg(s.MoonAltitude), MoonSeparation: deg(s.MoonSeparation),
	}
	if s.SinAltitude > 0 {
		x := visibility.Airmass(s.SinAltitude)
		m := visibility.SkyMagnitude(g.s.Filters[g.filter], visibility.Geometry{
			SinAltitude: s.SinAltitude, SunAltitude: s.SunAltitude, MoonAltitude: s.MoonAltitude,
			MoonSeparation: s.MoonSeparation, MoonPhaseAngle: phase,
		})
		row.Airmass, row.SkyMagnitude = &x, &m
	}
	why, usable := constraints.Blocked(g.s.Survey, g.s.Calendar, field, site, fr.T, func(filter int) constraints.Sight {
		if filter == g.filter {
			return s
		}
		return constraints.SkySight(g.sky, fr, field, filter)
	})
	row.Usable, row.BlockedBy = usable, why.String()
	return row
}

func deg(rad float64) float64 { return rad * 180 / math.Pi }
