package page

import (
	"context"
	"math"
	"net/http"

	"nightwright/constraints"
	"nightwright/constraints/survey"
	"nightwright/scheduler/ledger"
	"nightwright/scheduler/model"
	"nightwright/visibility"
)

type span [2]float64 // UTC, Unix s

func spans(in []visibility.Interval) []span {
	out := []span{}
	for _, iv := range in {
		out = append(out, span{rounded(iv.From, 0), rounded(iv.To, 0)})
	}
	return out
}

// laneJSON is one telescope's night.
type laneJSON struct {
	Telescope string      `json:"telescope"`
	Site      int         `json:"site"`
	Open      []span      `json:"open"`
	Lost      []lostJSON  `json:"lost"`
	OpenHours float64     `json:"open_hours"`
	UsedHours float64     `json:"used_hours"`
	Price     float64     `json:"price_millionths"`
	Visits    []visitJSON `json:"visits"`
}

type lostJSON struct {
	From  float64 `json:"from"`
	To    float64 `json:"to"`
	Cause string  `json:"cause"`
	Why   string  `json:"why"`
}

// siteNight is a site's sky in a night.
type siteNight struct {
	Set          []span       `json:"sun_down"`
	Nautical     []span       `json:"nautical"`
	Dark         []span       `json:"dark"`
	MoonUp       []span       `json:"moon_up"`
	Illumination float64      `json:"moon_illumination"`
	Sun          [][3]float64 `json:"sun"`  // instant, altitude, azimuth (rad)
	Moon         [][3]float64 `json:"moon"` // the same
}

// nightJSON is one night. A field's hour angle at site s and instant t is
// ha + longitude of s + rate x (t - at), rad; with its declination that places
// it on the sky to well under a pixel.
type nightJSON struct {
	Night    string      `json:"night"`
	From     float64     `json:"from"`
	To       float64     `json:"to"`
	Lanes    []laneJSON  `json:"lanes"`
	Sites    []siteNight `json:"sites"`
	At       float64     `json:"at"`
	Rate     float64     `json:"rate"`
	HourAng  []float64   `json:"ha"` // of each field at longitude 0, rad
	Declin   []float64   `json:"dec"`
	PlanMark string      `json:"plan"` // the plan's checksum
}

// siderealRate is the Earth's rotation, rad/s (IERS Conventions 2010, chapter
// 5: 2 pi x 1.00273781191135448 a UT1 day).
const siderealRate = 2 * math.Pi * 1.00273781191135448 / 86400

// getNight tells all about one night.
func getNight(s *Server, w http.ResponseWriter, r *http.Request) error {
	v, err := s.pick(r)
	if err != nil {
		return err
	}
	n, err := v.night(r.PathValue("night"))
	if err != nil {
		return err
	}
	lost, err := lossesOf(r.Context(), v)
	if err != nil {
		return err
	}
	day := v.FirstNight + survey.Day(n)
	out := nightJSON{Night: day.String(), From: math.Inf(1), To: math.Inf(-1), Rate: siderealRate, PlanMark: v.plan.Summary.Checksum}
	out.Sites = make([]siteNight, len(v.Sites))
	model.Parallel(s.cfg.Workers, len(v.Sites), func(i int) { out.Sites[i] = v.siteNight(i, int32(day)) })
	for i := range v.Sites {
		from, to := v.shown(i, n, out.Sites[i].Set)
		out.From, out.To = min(out.From, from), max(out.To, to)
	}
	prices := map[string][2]float64{}
	for i := range v.plan.Nights {
		if x := &v.plan.Nights[i]; x.Night == int32(day) {
			prices[x.Telescope] = [2]float64{x.PricePerHour, x.UsedHours}
		}
	}
	for t := range v.Telescopes {
		tel := &v.Telescopes[t]
		p := prices[tel.Name]
		l := laneJSON{Telescope: tel.Name, Site: tel.Site, Open: spans(v.Calendar.Open(t, n)), Lost: []lostJSON{},
			OpenHours: rounded(v.Calendar.OpenHours(t, n), 3), UsedHours: rounded(p[1], 3), Price: rounded(p[0]*1e6, 3), Visits: []visitJSON{}}
		iv := v.Calendar.Night(tel.Site, n)
		for _, x := range lost[t] {
			if x.To > iv.From && x.From < iv.To {
				l.Lost = append(l.Lost, x)
			}
		}
		for _, k := range v.nights[t][n] {
			l.Visits = append(l.Visits, v.visit(k))
		}
		out.Lanes = append(out.Lanes, l)
	}
	v.placeFields(&out, s.cfg.Workers)
	return sendJSON(w, r, out)
}

// shown is the stretch of a site's night that lanes show.
func (v *view) shown(site, n int, set []span) (from, to float64) {
	if len(set) > 0 {
		return set[0][0] - 900, set[len(set)-1][1] + 900
	}
	iv := v.Calendar.Night(site, n)
	return iv.From, iv.To
}

func (v *view) siteNight(site int, day int32) siteNight {
	place := constraints.Place(&v.Sites[site])
	row := v.Exact.Almanac(place, day)
	below := func(limit float64) []span { return spans(v.Exact.SunBelow(place, row.Night, limit*degree)) }
	out := siteNight{Set: below(-50.0 / 60), Nautical: below(-12), Dark: below(-18), MoonUp: spans(v.Exact.MoonAbove(place, row.Night)), Illumination: rounded(row.Illumination, 3)}
	const step = 900.0
	for t := row.Night.From; t < row.Night.To+step; t += step {
		at := v.Exact.At(t)
		sun, moon := at.Sun(place), at.Moon(place)
		out.Sun = append(out.Sun, [3]float64{rounded(t, 0), rounded(sun.Altitude, 4), rounded(sun.Azimuth, 4)})
		out.Moon = append(out.Moon, [3]float64{rounded(t, 0), rounded(moon.Altitude, 4), rounded(moon.Azimuth, 4)})
	}
	return out
}

// placeFields says where every field is in the middle of the night.
func (v *view) placeFields(out *nightJSON, workers int) {
	out.At = rounded((out.From+out.To)/2, 0)
	at := v.Exact.At(out.At)
	n := len(v.Survey.Fields)
	out.HourAng, out.Declin = make([]float64, n), make([]float64, n)
	model.Parallel(workers, n, func(i int) {
		f := &v.Survey.Fields[i]
		h := at.Star(visibility.Site{}, visibility.Position{RA: f.RA, Dec: f.Dec, PMRA: f.PMRA, PMDec: f.PMDec})
		out.HourAng[i], out.Declin[i] = rounded(h.HourAngle, 4), rounded(h.Declination, 4)
	})
}

// lossesOf is the lost time of each telescope, as the ledger has it now.
func lossesOf(ctx context.Context, v *view) ([][]lostJSON, error) {
	out := make([][]lostJSON, len(v.Telescopes))
	l, err := ledger.Open(v.LedgerPath())
	if err != nil {
		return nil, err
	}
	defer l.Close()
	rows, err := l.LossRows(ctx, ledger.Now)
	if err != nil {
		return nil, err
	}
	for t, stretches := range ledger.LostTime(v.Survey.Survey, rows) {
		for _, x := range stretches {
			out[t] = append(out[t], lostJSON{From: x.From, To: x.To, Cause: x.Cause})
		}
	}
	return out, nil
}
