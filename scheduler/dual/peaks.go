package dual

import (
	"math"

	"nightwright/scheduler/model"
	"nightwright/visibility"
)

// Peaks bounds the quality a unit can reach in each night: what lets the
// oracle and the search pass over most nights without looking. Stored in two
// bytes rounded up, by class, night, filter and unit.
type Peaks struct {
	units, filters, nights int
	top                    []uint16
	minRate                []float64 // least price in a telescope-night's open time; kept by SetPrices
}

// peakStep is the step of the frames the peaks are taken from, s.
const peakStep = 600

// NewPeaks computes the peaks of all windows.
func NewPeaks(p *model.Problem) *Peaks {
	classes := 0
	site := map[int32]int32{}
	for i := range p.Scopes {
		classes = max(classes, int(p.Scopes[i].Class)+1)
		site[p.Scopes[i].Class] = p.Scopes[i].Site
	}
	units, fieldOf := p.Units()
	pk := &Peaks{units: units, filters: p.Sky.Filters(), nights: p.Nights}
	pk.top = make([]uint16, classes*p.Nights*pk.filters*units)
	used := make([]bool, pk.filters*units)
	for i := range p.Wants {
		for _, st := range p.Wants[i].Steps {
			used[int(st.Filter)*units+int(p.Wants[i].Unit)] = true
		}
	}
	model.Parallel(p.Workers, classes*p.Nights, func(i int) {
		class, night := i/p.Nights, i%p.Nights
		s, ok := site[int32(class)]
		if !ok {
			return
		}
		fine := p.Grid(int(s), night)
		if fine == nil {
			return
		}
		g := p.Sky.FrameGrid(int(s), fine.From, fine.From+fine.Step*float64(fine.Cells()), peakStep)
		for u := range units {
			pk.unit(p, g, class, night, u, fieldOf[u], used)
		}
	})
	return pk
}

// unit fills the peaks of one unit, class and night.
func (pk *Peaks) unit(p *model.Problem, g *visibility.FrameGrid, class, night, u, field int, used []bool) {
	windows := p.Outer(nil, int32(u), int32(class), night)
	if len(windows) == 0 {
		return
	}
	c := p.Sky.Direction(field, g.From+g.Step*float64(len(g.Frames)/2))
	end := g.From + g.Step*float64(g.Cells())
	for f := range pk.filters {
		if !used[f*pk.units+u] {
			continue
		}
		best := 0.0
		for _, w := range windows {
			from, to := math.Max(model.Sec(w.From), g.From), math.Min(model.Sec(w.To), end)
			if to <= from {
				continue
			}
			for k := g.Cell(from); k <= g.Cell(to); k++ {
				l, r := p.Sky.UpperProfile(g, k, f, c)
				best = math.Max(best, math.Max(l, r))
			}
		}
		pk.top[((class*pk.nights+night)*pk.filters+f)*pk.units+u] = uint16(math.Min(65535, math.Ceil(best*65535)))
	}
}

// Top returns the bound on quality of a unit in a filter, class and night.
func (pk *Peaks) Top(class int32, night int, filter, unit int32) float64 {
	return float64(pk.top[((int(class)*pk.nights+night)*pk.filters+int(filter))*pk.units+int(unit)]) / 65535
}

// SetPrices notes the least price of each telescope-night.
func (pk *Peaks) SetPrices(pr *Prices) {
	pk.minRate = make([]float64, len(pr.nights))
	for i := range pr.nights {
		pn := &pr.nights[i]
		least := math.Inf(1)
		for k := range pn.open {
			if pn.open[k] {
				least = math.Min(least, pr.rate[pn.slots[k]])
			}
		}
		if math.IsInf(least, 1) {
			least = 0
		}
		pk.minRate[i] = least
	}
}

// limit bounds the worth of any visit of a want in a telescope-night. The
// price is charged for the exposures' own length only: a gap may lie outside
// the open time.
func (pk *Peaks) limit(p *model.Problem, w *model.Want, t int32, night int) float64 {
	var sum float64
	rate := pk.minRate[int(t)*pk.nights+night]
	for i := range w.Steps {
		q := pk.Top(p.Scopes[t].Class, night, w.Steps[i].Filter, w.Unit)
		if q == 0 {
			return 0
		}
		sum += w.Value/float64(len(w.Steps))*q - rate*model.Sec(p.Length(&w.Steps[i], t))
	}
	return sum
}
