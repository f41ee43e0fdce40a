package work

import (
	"nightwright/constraints"
	"nightwright/constraints/survey"
	"nightwright/scenarios/weather"
	"nightwright/scheduler"
	"nightwright/scheduler/model"
)

// expectedWeather says what part of each telescope's time the sky leaves on
// the mean: the month's clear fraction at its site, hour by hour.
func (s *Survey) expectedWeather() scheduler.Weather {
	const hour = 3600 * model.Micro
	first := int64(s.FirstNight-2) * 24
	open := make([][]float64, len(s.Sites))
	for i := range s.Sites {
		c, _ := weather.Of(&s.Sites[i])
		open[i] = make([]float64, (s.Nights()+5)*24)
		c.Forecast(open[i], first, -1)
	}
	return scheduler.Weather{
		Calendar: func(sv *survey.Survey) *constraints.Calendar { return constraints.NewCalendar(sv, s.Exact, s.Losses) },
		Usable: func(telescope int, from, to int64) float64 {
			row := open[s.Telescopes[telescope].Site]
			sum, at := 0.0, from
			for at < to {
				end := min(to, (at/hour+1)*hour)
				k := min(max(at/hour-first, 0), int64(len(row)-1))
				sum += row[k] * float64(end-at)
				at = end
			}
			return sum / float64(max(1, to-from))
		},
	}
}
