package model

import (
	"context"
	"errors"
	"fmt"
	"math"

	"nightwright/constraints"
	"nightwright/constraints/mount"
	"nightwright/constraints/survey"
	"nightwright/visibility"
	"nightwright/visibility/ephemeris"
)

// Problem is what a solver works on: dense ids, flat slices, every rule
// resolved. It is immutable and safe for concurrent use. Instants are UTC in
// Unix microseconds unless a name says otherwise.
type Problem struct {
	Survey   *survey.Survey
	Sky      *visibility.Sky
	Calendar *constraints.Calendar
	Windows  *constraints.Windows
	Shelf    *Shelf
	Workers  int

	Wants     []Want                  // all demands of all fields that some telescope may serve
	FieldWant []int32                 // Wants of field f are Wants[FieldWant[f]:FieldWant[f+1]]
	Scopes    []Scope                 // telescopes
	Nights    int                     // labels
	open      [][]Span                // [telescope * Nights + night]
	outer     [][]Span                // the same, widened for the ceiling
	grids     []*visibility.FrameGrid // [site * Nights + night]
	edges     [][]visibility.MoonEdge // [site * Nights + night]
	bonus     []float64               // [field]
	MaxValue  float64                 // largest Want.Value, for scales

	// What is given; see Take.
	Earned       float64    // C of the given visits, and of fields finished by them
	GivenSeconds []float64  // [program] their scaled exposure time in the period; nil: none
	Busy         []Exposure // of them, where they share a night with what is planned
}

// Want is one demand of one field.
type Want struct {
	Field, Demand int32
	Unit          int32   // window unit
	Visits        int32   // still to be planned
	Value         float64 // C per unit of quality and visit: w_f / (N_f (1+b) sum w)
	MinQuality    float64
	Steps         []Step  // the exposures of a visit
	GapMin        int64   // us between starts
	Spacing       int64   // us a plan keeps between starts: GapMin, or what keeps two sets apart
	PerNight      int32   // 0: no limit
	Scopes        []int32 // telescopes that may serve it, ascending
	Program       int32
	bounds        []bound // given visits that bind the cadence, by start
}

// Step is one exposure of a visit.
type Step struct {
	Filter    int32
	Duration  float64 // s, before the telescope's scale
	After     int64   // us after the start of the step before
	Tolerance int64   // us
	Row       int32   // in the shelf
}

// Scope is a telescope as the optimiser sees it.
type Scope struct {
	*survey.Telescope
	ID, Site, Class int32
	LeastGap        int64 // us, least gap after any exposure
	TypicalGap      int64 // us, a gap with a slew of typicalSlew
}

// Span is [From, To), UTC Unix microseconds.
type Span struct{ From, To int64 }

// GridStep is the step of the shared frames, s.
const GridStep = 300

// Micro is one second in the plan's unit of time.
const Micro = 1_000_000

// Sec turns microseconds into seconds.
func Sec(us int64) float64 { return float64(us) * 1e-6 }

// MicroCeil turns seconds into microseconds, rounded up to a millisecond, so
// that a computed gap is never too short.
func MicroCeil(s float64) int64 { return int64(math.Ceil(s*1e3-1e-6)) * 1000 }

// MicroOf turns seconds into the nearest microsecond.
func MicroOf(s float64) int64 { return int64(math.Round(s * 1e6)) }

// NewProblem gathers the survey, its sky, calendar and windows. It errs when
// the parts don't belong together.
func NewProblem(sv *survey.Survey, sky *visibility.Sky, cal *constraints.Calendar, win *constraints.Windows, workers int) (*Problem, error) {
	return NewProblemWithin(context.Background(), sv, sky, cal, win, workers)
}

// NewProblemWithin is NewProblem, given up with the context's error when it
// ends: a season's tables of quality take seconds.
func NewProblemWithin(ctx context.Context, sv *survey.Survey, sky *visibility.Sky, cal *constraints.Calendar, win *constraints.Windows, workers int) (*Problem, error) {
	if sky.Fields() != len(sv.Fields) || sky.Sites() != len(sv.Sites) {
		return nil, errors.New("model: the sky tables belong to another survey")
	}
	p := &Problem{Survey: sv, Sky: sky, Calendar: cal, Windows: win, Workers: max(1, workers), Nights: sv.Nights()}
	p.setScopes()
	p.setOpen()
	p.setGrids(ctx)
	total := sv.TotalWeight()
	if !(total > 0) {
		return nil, fmt.Errorf("model: the weights sum to %g; want a sum above 0", total)
	}
	for f := range sv.Fields {
		p.FieldWant = append(p.FieldWant, int32(len(p.Wants)))
		p.addWants(f, total)
	}
	p.FieldWant = append(p.FieldWant, int32(len(p.Wants)))
	p.setShelf(ctx)
	return p, ctx.Err()
}

// typicalSlew is the slew that plans make on the whole, rad (measured on the
// starter surveys: 10 to 20 deg).
const typicalSlew = 15 * math.Pi / 180

func (p *Problem) setScopes() {
	for i := range p.Survey.Telescopes {
		t := &p.Survey.Telescopes[i]
		p.Scopes = append(p.Scopes, Scope{
			Telescope: t, ID: int32(i), Site: int32(t.Site), Class: int32(p.Windows.Class(i)),
			// Rounded down: it enters the ceiling.
			LeastGap:   int64(math.Floor(mount.LeastGap(t)*1e3)) * 1000,
			TypicalGap: MicroCeil(math.Max(t.Readout, t.Slew.Settle+mount.AxisTime(typicalSlew, t.Slew.Rate, t.Slew.Acceleration))),
		})
	}
}

func (p *Problem) setOpen() {
	p.open = make([][]Span, len(p.Scopes)*p.Nights)
	p.outer = make([][]Span, len(p.Scopes)*p.Nights)
	for t := range p.Scopes {
		for n := range p.Nights {
			for _, o := range p.Calendar.Open(t, n) {
				// Inward to whole milliseconds; for the ceiling outward by more
				// than the root finding's error.
				p.outer[t*p.Nights+n] = append(p.outer[t*p.Nights+n], Span{MicroOf(o.From) - outerSlack, MicroOf(o.To) + outerSlack})
				s := Span{MicroCeil(o.From), int64(math.Floor(o.To*1e3)) * 1000}
				if s.To > s.From {
					p.open[t*p.Nights+n] = append(p.open[t*p.Nights+n], s)
				}
			}
		}
		p.partNights(t)
	}
}

// partNights shortens a telescope's open time before a night that follows
// without a break, as at the poles, by the longest gap there can be: nights are
// filled apart, but the gap between them is needed where it is dark at the
// Sun's transit. The ceiling's open time keeps its length.
func (p *Problem) partNights(scope int) {
	t := p.Scopes[scope].Telescope
	longest := math.Max(t.Readout, t.Slew.Settle+mount.AxisTime(2*math.Pi, t.Slew.Rate, t.Slew.Acceleration)) + t.FilterChange
	if t.Flip != nil {
		longest += t.Flip.Time
	}
	for n := range p.Nights - 1 {
		open, next := p.open[scope*p.Nights+n], p.open[scope*p.Nights+n+1]
		if len(next) == 0 {
			continue
		}
		latest := next[0].From - MicroCeil(longest)
		for len(open) > 0 && open[len(open)-1].To > latest {
			last := &open[len(open)-1]
			if last.To = latest; last.To > last.From {
				break
			}
			open = open[:len(open)-1]
		}
		p.open[scope*p.Nights+n] = open
	}
}

// outerSlack is how much wider than computed the ceiling takes open time, us.
const outerSlack = 5000

// OpenOuter returns the open intervals of a telescope-night widened by a few
// milliseconds; they may touch.
func (p *Problem) OpenOuter(scope, night int) []Span { return p.outer[scope*p.Nights+night] }

// setGrids builds the frames of every site and night over the open time of
// its telescopes.
func (p *Problem) setGrids(ctx context.Context) {
	sites := len(p.Survey.Sites)
	p.grids = make([]*visibility.FrameGrid, sites*p.Nights)
	p.edges = make([][]visibility.MoonEdge, sites*p.Nights)
	Parallel(p.Workers, len(p.grids), func(i int) {
		if ctx.Err() != nil {
			return
		}
		site, n := i/p.Nights, i%p.Nights
		from, to := math.Inf(1), math.Inf(-1)
		for _, t := range p.Survey.Sites[site].Telescopes {
			for _, o := range p.outer[t*p.Nights+n] {
				from, to = math.Min(from, Sec(o.From)), math.Max(to, Sec(o.To))
			}
		}
		if to > from {
			p.grids[i] = p.Sky.FrameGrid(site, from-2, to+2, GridStep)
			p.edges[i] = p.Sky.MoonEdges(site, p.grids[i])
		}
	})
}

func (p *Problem) addWants(f int, total float64) {
	sv := p.Survey
	fd := &sv.Fields[f]
	n := sv.Wanted(fd)
	p.bonus = append(p.bonus, sv.FinishBonus*sv.WeightOf(fd)/((1+sv.FinishBonus)*total))
	value := sv.WeightOf(fd) / (float64(n) * (1 + sv.FinishBonus) * total)
	demands := sv.Programs[fd.Program].Demands
	for d := range demands {
		dm := &demands[d]
		w := Want{
			Field: int32(f), Demand: int32(d), Unit: int32(p.Windows.Unit(f, d)), Visits: int32(dm.Visits),
			Value: value, MinQuality: fd.Rules[d].MinQuality, GapMin: MicroCeil(dm.GapMin),
			PerNight: int32(dm.PerNight), Program: int32(fd.Program),
		}
		for _, e := range dm.Exposures {
			w.Steps = append(w.Steps, Step{Filter: int32(e.Filter), Duration: e.Duration, After: MicroOf(e.After), Tolerance: MicroOf(e.Tolerance)})
		}
		for t := range sv.Telescopes {
			if sv.Qualifies(fd, dm, t) {
				w.Scopes = append(w.Scopes, int32(t))
			}
		}
		w.Spacing = max(w.GapMin, p.setSpan(&w))
		p.MaxValue = math.Max(p.MaxValue, value)
		p.Wants = append(p.Wants, w)
	}
}

// LongestVisits returns, by program, the longest scaled exposure time one
// visit can have, s.
func (p *Problem) LongestVisits() []float64 {
	out := make([]float64, len(p.Survey.Programs))
	for i := range p.Wants {
		w := &p.Wants[i]
		for _, t := range w.Scopes {
			var s float64
			for k := range w.Steps {
				s += Sec(p.Length(&w.Steps[k], t))
			}
			out[w.Program] = max(out[w.Program], s)
		}
	}
	return out
}

// setSpan returns the longest a set can last, us: two sets of a demand on one
// field must not overlap.
func (p *Problem) setSpan(w *Want) int64 {
	if len(w.Steps) < 2 {
		return 0
	}
	var span, last int64
	for i := range w.Steps {
		span += w.Steps[i].After + w.Steps[i].Tolerance
	}
	for _, t := range w.Scopes {
		last = max(last, p.Length(&w.Steps[len(w.Steps)-1], t))
	}
	return span + last
}

// Open returns the open intervals of a telescope-night, ascending.
func (p *Problem) Open(scope, night int) []Span { return p.open[scope*p.Nights+night] }

// Grid returns the frames of a site and night, or nil when it is never open.
func (p *Problem) Grid(site, night int) *visibility.FrameGrid { return p.grids[site*p.Nights+night] }

// MoonEdges returns the moonrises and moonsets of a site's night.
func (p *Problem) MoonEdges(site, night int) []visibility.MoonEdge {
	return p.edges[site*p.Nights+night]
}

// Bonus returns what finishing a field adds to C. A field with a demand that
// no telescope may serve can't be finished.
func (p *Problem) Bonus(f int) float64 { return p.bonus[f] }

// Direction returns the apparent direction of a want's field.
func (p *Problem) Direction(w *Want, us int64) ephemeris.Vec {
	return p.Sky.Direction(int(w.Field), Sec(us))
}

// Length returns the duration of a step on a telescope, us.
func (p *Problem) Length(s *Step, scope int32) int64 {
	return MicroOf(s.Duration * p.Scopes[scope].ExposureScale)
}

// Quality returns q of a step whose middle is at the instant, on a telescope.
func (p *Problem) Quality(w *Want, step int, scope int32, middle int64) float64 {
	t := Sec(middle)
	fr := p.Sky.Frame(int(p.Scopes[scope].Site), t)
	return p.Sky.Quality(&fr, int(w.Steps[step].Filter), p.Sky.Direction(int(w.Field), t))
}

// Budget returns the longest use (exposures and needed gaps) that keep_free
// leaves a telescope-night, us.
func (p *Problem) Budget(scope, night int) int64 {
	return int64(p.Calendar.Budget(scope, night) * Micro)
}

// Outer appends the windows of a unit widened by the windows' edge slack, for
// the ceiling: no legal exposure begins before or ends after.
func (p *Problem) Outer(dst []Span, unit, class int32, night int) []Span {
	var buf [8]constraints.Window
	for _, w := range p.Windows.AppendOuter(buf[:0], int(unit), int(class), night) {
		dst = append(dst, Span{p.us(w.From), p.us(w.To)})
	}
	return dst
}

// Inward returns a window's edges as a plan may use them.
func (p *Problem) Inward(w constraints.Window) (from, to int64) { return p.us(w.From), p.us(w.To) }

func (p *Problem) us(rel int32) int64 {
	return (p.Windows.Epoch() + int64(rel)) * Micro
}
