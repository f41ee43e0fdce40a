package work

import (
	"context"
	"math"

	"nightwright/constraints"
	"nightwright/constraints/survey"
	"nightwright/scheduler/model"
	"nightwright/scheduler/tables"
)

// Almanac returns a row per site and night of the survey's period, for the
// sites that are named, or all.
func Almanac(ctx context.Context, s *Survey, sites []string, o Options) ([]tables.AlmanacRow, error) {
	ids, err := s.pickSites(sites)
	if err != nil {
		return nil, err
	}
	nights := s.Nights()
	rows := make([]tables.AlmanacRow, len(ids)*nights)
	o.tell("almanac", 0, 1)
	model.Parallel(o.Workers, len(rows), func(i int) {
		if ctx.Err() == nil {
			site := &s.Sites[ids[i/nights]]
			rows[i] = almanacRow(s, site, s.FirstNight+survey.Day(i%nights))
		}
	})
	o.tell("almanac", 1, 1)
	if err := ctx.Err(); err != nil {
		return nil, err
	}
	tables.Almanac.Sort(rows)
	return rows, nil
}

func almanacRow(s *Survey, site *survey.Site, day survey.Day) tables.AlmanacRow {
	a := s.Exact.Almanac(constraints.Place(site), int32(day))
	return tables.AlmanacRow{
		Site: site.Name, Night: int32(day),
		Sunset: micros(a.Horizon.Down), DuskCivil: micros(a.Civil.Down), DuskNautical: micros(a.Nautical.Down), DuskAstronomical: micros(a.Dark.Down),
		DawnAstronomical: micros(a.Dark.Up), DawnNautical: micros(a.Nautical.Up), DawnCivil: micros(a.Civil.Up), Sunrise: micros(a.Horizon.Up),
		Moonrise: firstOf(a.Moonrise), Moonset: firstOf(a.Moonset), MoonIllumination: a.Illumination, DarkHours: a.DarkHours,
	}
}

// micros turns Unix seconds into microseconds; what doesn't happen is 0.
func micros(unix float64) int64 {
	if math.IsNaN(unix) {
		return 0
	}
	return int64(math.Round(unix * 1e6))
}

func firstOf(instants []float64) int64 {
	if len(instants) == 0 {
		return 0
	}
	return micros(instants[0])
}

// pickSites returns the ids of the named sites in the survey's order; no name
// means all.
func (s *Survey) pickSites(names []string) ([]int, error) {
	return pick(len(s.Sites), names, s.SiteID)
}

// pickFields does the same for fields.
func (s *Survey) pickFields(names []string) ([]int, error) {
	return pick(len(s.Fields), names, s.FieldID)
}

func pick(n int, names []string, id func(string) (int, error)) ([]int, error) {
	taken := make([]bool, n)
	for _, name := range names {
		i, err := id(name)
		if err != nil {
			return nil, err
		}
		taken[i] = true
	}
	var ids []int
	for i := range n {
		if taken[i] || len(names) == 0 {
			ids = append(ids, i)
		}
	}
	return ids, nil
}
