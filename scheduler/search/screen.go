package search

import (
	"math"

	"nightwright/scheduler/model"
)

// screen leaves in f.worthy the stretches of starts that can be worth more than
// least: by the better of the shelf's qualities about the middle, less the
// price of the exposure alone. A spot that would only pay because what it
// ejects isn't worth its own price is passed over: its own field sees to that.
func (f *finder) screen() {
	f.worthy = f.worthy[:0]
	if f.only.To != 0 {
		f.worthy = append(f.worthy, f.only)
		return
	}
	s := f.s
	half := f.length / 2
	for k := 0; k+1 < len(f.row); k++ {
		q := float64(int(max(f.row[k], f.row[k+1]))+1) / 255
		worth := f.value*q*(1+f.noise) + f.extra
		if worth <= f.least {
			continue
		}
		r := Range{f.first + int64(k)*shelfUS - half, f.first + int64(k+1)*shelfUS - half}
		if s.theta > 0 {
			price := min(s.price.At(int(f.scope), r.From), s.price.At(int(f.scope), r.To))
			if worth-s.theta*price*model.Sec(f.length) <= f.least {
				continue
			}
		}
		if n := len(f.worthy); n > 0 && f.worthy[n-1].To == r.From {
			f.worthy[n-1].To = r.To
		} else {
			f.worthy = append(f.worthy, r)
		}
	}
	// quality takes the last byte for all that is later, the first for earlier.
	if n := len(f.worthy); n > 0 {
		if f.worthy[n-1].To == f.first+int64(len(f.row)-1)*shelfUS-half {
			f.worthy[n-1].To = math.MaxInt64 / 2
		}
		if f.worthy[0].From == f.first-half {
			f.worthy[0].From = math.MinInt64 / 2
		}
	}
}

// beaten reports whether the bin of a position already has a spot that is worth
// more than the position can be: its quality hardly changes over a few minutes,
// and the gaps only take.
func (f *finder) beaten(seed, span int64, worth, lost float64, need int64) bool {
	k := len(f.spots) - 1
	if k < 0 || span > 600*model.Micro || f.noise > 0 {
		return false
	}
	last := &f.spots[k]
	if last.scope != f.scope || last.night != f.night || last.start/f.bin != seed/f.bin {
		return false
	}
	if need > 0 && f.s.theta > 0 {
		lost += f.s.theta * f.s.price.At(int(f.scope), seed) * model.Sec(need)
	}
	return worth*1.003+f.extra-lost <= last.profit
}
