package model

import (
	"context"
	"math"

	"nightwright/visibility"
)

// Shelf keeps, for every unit, filter, class and night, the quality along the
// windows in steps of ShelfStep, one byte each, and a bound on the greatest
// quality, rounded up. It is what price search and plan search look things up
// in; true qualities and bounds are worked out afresh where they count.
type Shelf struct {
	rows   int
	nights int
	pages  []page // [class*nights + night]
}

// page is one class and night.
type page struct {
	first []int32 // [row] first step, in ShelfStep since 1970
	from  []int32 // [row+1] into data
	data  []uint8
	top   []uint16 // [row] bound on the quality times 65535
}

// ShelfStep is the time between two bytes, s.
const ShelfStep = 600

// Row returns the bytes of a row in a night: quality times 255 at the
// instants (first + i) ShelfStep; nil when it has no window there.
func (s *Shelf) Row(class int32, night int, row int32) (first int32, q []uint8) {
	pg := &s.pages[int(class)*s.nights+night]
	if len(pg.from) == 0 {
		return 0, nil
	}
	return pg.first[row], pg.data[pg.from[row]:pg.from[row+1]]
}

// Top returns a bound on a row's quality in a night; 0 without windows.
func (s *Shelf) Top(class int32, night int, row int32) float64 {
	pg := &s.pages[int(class)*s.nights+night]
	if len(pg.top) == 0 {
		return 0
	}
	return float64(pg.top[row]) / 65535
}

// Bytes returns the memory the shelf takes.
func (s *Shelf) Bytes() int64 {
	var n int64
	for i := range s.pages {
		pg := &s.pages[i]
		n += int64(4*len(pg.first) + 4*len(pg.from) + len(pg.data) + 2*len(pg.top))
	}
	return n
}

// setRows numbers the distinct pairs of unit and filter in the steps.
func (p *Problem) setRows() (units, filters, fields []int32) {
	type key struct{ unit, filter int32 }
	seen := map[key]int32{}
	for i := range p.Wants {
		w := &p.Wants[i]
		for k := range w.Steps {
			at := key{w.Unit, w.Steps[k].Filter}
			row, ok := seen[at]
			if !ok {
				row = int32(len(units))
				seen[at] = row
				units, filters, fields = append(units, at.unit), append(filters, at.filter), append(fields, w.Field)
			}
			w.Steps[k].Row = row
		}
	}
	return units, filters, fields
}

// setShelf fills the shelf.
func (p *Problem) setShelf(ctx context.Context) {
	units, filters, fields := p.setRows()
	siteOf := make([]int32, p.Windows.Classes())
	for i := range siteOf {
		siteOf[i] = -1
	}
	for i := range p.Scopes {
		siteOf[p.Scopes[i].Class] = p.Scopes[i].Site
	}
	s := &Shelf{rows: len(units), nights: p.Nights, pages: make([]page, len(siteOf)*p.Nights)}
	Parallel(p.Workers, len(s.pages), func(i int) {
		class, night := i/p.Nights, i%p.Nights
		if siteOf[class] < 0 || ctx.Err() != nil {
			return
		}
		fine := p.Grid(int(siteOf[class]), night)
		if fine == nil {
			return
		}
		end := fine.From + fine.Step*float64(fine.Cells())
		g := p.Sky.FrameGrid(int(siteOf[class]), fine.From, end, ShelfStep)
		p.fillPage(&s.pages[i], g, int32(class), night, units, filters, fields)
	})
	p.Shelf = s
}

func (p *Problem) fillPage(pg *page, g *visibility.FrameGrid, class int32, night int, units, filters, fields []int32) {
	n := len(units)
	pg.first, pg.from, pg.top = make([]int32, n), make([]int32, n+1), make([]uint16, n)
	base := int32(math.Round(g.From / ShelfStep))
	mid := g.From + g.Step*float64(len(g.Frames)/2)
	var spans []Span
	data := make([]uint8, 0, 20*n)
	for r := range n {
		pg.from[r] = int32(len(data))
		spans = p.Outer(spans[:0], units[r], class, night)
		if len(spans) == 0 {
			continue
		}
		lo, hi := spans[0].From, spans[0].To
		for _, s := range spans[1:] {
			lo, hi = min(lo, s.From), max(hi, s.To)
		}
		k0, k1 := g.Cell(Sec(lo)), g.Cell(Sec(hi))+1
		if Sec(hi) <= g.From || Sec(lo) >= g.From+g.Step*float64(g.Cells()) {
			continue
		}
		pg.first[r] = base + int32(k0)
		c := p.Sky.Direction(int(fields[r]), mid)
		top := 0.0
		for k := k0; k <= k1; k++ {
			q, up := p.Sky.NodeQuality(g, k, int(filters[r]), c)
			data = append(data, uint8(math.Round(q*255)))
			top = math.Max(top, up)
		}
		pg.top[r] = uint16(math.Min(65535, math.Ceil(top*65535)))
	}
	pg.from[n] = int32(len(data))
	pg.data = append([]uint8(nil), data...)
}
