package outlook

import (
	"context"
	"math"

	"nightwright/constraints"
	"nightwright/constraints/mount"
	"nightwright/constraints/survey"
	"nightwright/scheduler/model"
	"nightwright/visibility"
)

// Input is what an outlook is made from.
type Input struct {
	Survey   *survey.Survey
	Exact    *visibility.Exact
	Sky      *visibility.Sky
	Calendar *constraints.Calendar
	Windows  *constraints.Windows
	Workers  int
}

// Report is the outlook of a survey.
type Report struct {
	Telescopes []TelescopeHours // by telescope id
	Ascension  [Bins]SkyBalance // by right ascension, 2 h each from 0 h
	Months     []MonthBalance   // of the period, in order
	Asked      float64          // h of telescope time that every demand together would take
	Open       float64          // h open, less keep_free
	Losses     []Loss           // what rules take away, the greatest first
	Usable     float64          // what they leave of the same time
	Shut       []Shut           // demands no window opens for, by field and demand
	Short      []Short          // demands that can't get every visit, by field and demand
	ShortField int              // fields with at least one such demand
}

// Bins is the number of bins of right ascension.
const Bins = 12

// Balance is demand against supply, h.
type Balance struct{ Asked, Open float64 }

// SkyBalance is the balance of a part of the sky. Open counts the hours with
// that right ascension on the meridian; Seen is how long a field there can be
// observed, summed over sites, as a mean weighted by what is asked. Hours that
// fields of several bins can be seen in stand in each of them.
type SkyBalance struct {
	Balance
	Seen float64
}

// MonthBalance is one calendar month of the period.
type MonthBalance struct {
	Year, Month int // month 1 to 12
	Nights      int
	Balance
}

// TelescopeHours is what one telescope has in the period.
type TelescopeHours struct {
	Dark float64 // Sun under -18 deg at its site
	Open float64 // under the loosest Sun limit, less closures, losses and reserves
	Free float64 // of these, what keep_free leaves
}

// Shut is a demand that has no legal instant in the whole period.
type Shut struct {
	Field, Demand int
	Limit         string // the rule that takes the most, or "telescope" when none qualifies
}

// Short is a demand whose windows can't hold all its visits.
type Short struct {
	Field, Demand int
	Wanted, Most  int
	Limit         string // "gap", "per_night" or "windows"
}

// Look makes the outlook. The result doesn't depend on the number of workers.
// It errs only when ctx ends.
func Look(ctx context.Context, in Input) (*Report, error) {
	r := &Report{Telescopes: make([]TelescopeHours, len(in.Survey.Telescopes))}
	months := monthsOf(in.Survey)
	r.Months = months.rows
	in.supply(r, months)
	sv := in.Survey
	fields := make([]fieldLook, len(sv.Fields))
	model.Parallel(in.Workers, len(fields), func(f int) {
		if ctx.Err() == nil {
			fields[f] = in.field(f, months)
		}
	})
	if err := ctx.Err(); err != nil {
		return nil, err
	}
	for f := range fields {
		r.add(sv, f, &fields[f])
	}
	for i := range r.Ascension {
		if b := &r.Ascension[i]; b.Asked > 0 {
			b.Seen /= b.Asked
		}
	}
	var err error
	if r.Losses, r.Usable, err = in.losses(ctx); err != nil {
		return nil, err
	}
	if err := in.nameLimits(ctx, r.Shut); err != nil {
		return nil, err
	}
	return r, nil
}

// add counts one field in.
func (r *Report) add(sv *survey.Survey, f int, look *fieldLook) {
	bin := int(sv.Fields[f].RA / (2 * math.Pi) * Bins)
	bin = min(max(bin, 0), Bins-1)
	short := false
	for d := range look.demands {
		l := &look.demands[d]
		r.Asked += l.asked
		b := &r.Ascension[bin]
		b.Asked += l.asked
		total := 0.0
		for _, h := range l.usable {
			total += h
		}
		if total == 0 {
			limit := ""
			if !l.served || l.limit == constraints.Quality.String() {
				limit = l.limit
			}
			r.Shut = append(r.Shut, Shut{Field: f, Demand: d, Limit: limit})
			short = true
			continue
		}
		b.Seen += l.asked * total // divided by Asked at the end
		for m, h := range l.usable {
			r.Months[m].Asked += l.asked * h / total
		}
		if l.most < l.wanted {
			r.Short = append(r.Short, Short{Field: f, Demand: d, Wanted: l.wanted, Most: l.most, Limit: l.limit})
			short = true
		}
	}
	if short {
		r.ShortField++
	}
}

// calendarMonths maps the period's nights to its months.
type calendarMonths struct {
	rows []MonthBalance
	of   []int // by night
}

func monthsOf(sv *survey.Survey) calendarMonths {
	var m calendarMonths
	for n := range sv.Nights() {
		t := (sv.FirstNight + survey.Day(n)).Time()
		if k := len(m.rows) - 1; k < 0 || m.rows[k].Year != t.Year() || m.rows[k].Month != int(t.Month()) {
			m.rows = append(m.rows, MonthBalance{Year: t.Year(), Month: int(t.Month())})
		}
		m.rows[len(m.rows)-1].Nights++
		m.of = append(m.of, len(m.rows)-1)
	}
	return m
}

// siderealStep is how finely open time is spread over right ascension, s.
const siderealStep = 600

// supply adds up what the telescopes have.
func (in *Input) supply(r *Report, months calendarMonths) {
	sv := in.Survey
	type part struct {
		hours TelescopeHours
		month []float64
		bins  [Bins]float64
	}
	parts := make([]part, len(sv.Telescopes))
	model.Parallel(in.Workers, len(parts), func(t int) {
		p := &parts[t]
		p.month = make([]float64, len(months.rows))
		tel := &sv.Telescopes[t]
		for n := range sv.Nights() {
			p.hours.Dark += in.Calendar.DarkHours(tel.Site, n)
			p.hours.Open += in.Calendar.OpenHours(t, n)
			free := in.Calendar.Budget(t, n) / 3600
			p.hours.Free += free
			p.month[months.of[n]] += free
			for _, o := range in.Calendar.Open(t, n) {
				for from := o.From; from < o.To; from += siderealStep {
					to := math.Min(from+siderealStep, o.To)
					lst := in.Exact.At((from + to) / 2).SiderealTime(sv.Sites[tel.Site].Longitude)
					bin := min(int(lst/(2*math.Pi)*Bins), Bins-1)
					p.bins[bin] += (1 - tel.KeepFree) * (to - from) / 3600
				}
			}
		}
	})
	for t := range parts {
		p := &parts[t]
		r.Telescopes[t] = p.hours
		r.Open += p.hours.Free
		for m, h := range p.month {
			r.Months[m].Open += h
		}
		for b, h := range p.bins {
			r.Ascension[b].Open += h
		}
	}
}

// visitHours returns the telescope time of one visit of a demand, exposures
// and the least gaps after them, as the mean over the telescopes that qualify;
// false when none does.
func visitHours(sv *survey.Survey, f *survey.Field, d *survey.Demand) (h float64, ok bool) {
	n := 0
	for t := range sv.Telescopes {
		if !sv.Qualifies(f, d, t) {
			continue
		}
		tel := &sv.Telescopes[t]
		for i := range d.Exposures {
			h += (d.Exposures[i].Duration*tel.ExposureScale + mount.LeastGap(tel)) / 3600
		}
		n++
	}
	if n == 0 {
		return 0, false
	}
	return h / float64(n), true
}
