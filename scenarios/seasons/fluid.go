package seasons

import "math"

// fluid is the coarse model of the rest of a season that prices telescope
// time: visits are fractions, nights have hours, hours have a chance to be
// open. With c the chance of an option's hour, v its value and t its time, it
// is the linear program
//
//	max sum c x v  s. t.  sum over wants of x t <= capacity of each hour (while it is open),
//	                      sum over options of c x <= visits left of each want,  0 <= x <= 1,
//
// the usual deterministic bound of an expectation (Gallego & van Ryzin 1997;
// bid prices: Talluri & van Ryzin 1998), solved for prices by a subgradient
// method with relative steps. Its multipliers of wants say what a visit left
// for later is worth.
type fluid struct {
	st     *Stage
	active []bool

	price  []float64 // [block] C per second of open time
	chance []float64 // [block] probability to be open
	load   []float64
	drift  []float64 // [block] running mean of the relative excess

	// By want and night: the best option then, over telescopes and hours.
	worth []float32 // C of an attempt under an open sky, price of its time taken off
	odds  []float32 // its chance
	where []int32   // its block
	who   []int16   // its telescope
	mu    []float64 // [want] what a visit left for later is worth, C
	left  []int32   // [want] visits left
	boost []float64 // [want] what a visit adds towards its field's finish bonus
	prob  []float64 // scratch: an hour's chance
	gain  []float64 // scratch of the choice over nights
	best  []float64
	take  []bool
}

func newFluid(st *Stage, active []bool) *fluid {
	n := len(st.p.Wants)
	f := &fluid{
		st: st, active: active,
		price: make([]float64, st.blocks), chance: make([]float64, st.blocks), load: make([]float64, st.blocks), drift: make([]float64, st.blocks),
		worth: make([]float32, n*st.p.Nights), odds: make([]float32, n*st.p.Nights), where: make([]int32, n*st.p.Nights), who: make([]int16, n*st.p.Nights),
		mu: make([]float64, n), left: make([]int32, n), boost: make([]float64, n),
		prob: make([]float64, st.hours),
		gain: make([]float64, st.p.Nights+1), best: make([]float64, st.p.Nights+64), take: make([]bool, st.p.Nights+1),
	}
	for w := range st.p.Wants {
		f.left[w] = st.p.Wants[w].Visits
	}
	return f
}

// know sets the chances of all hours from hour on: the state of each site at
// hour is known when now isn't nil, and only the climate without it.
func (f *fluid) know(hour int64, now func(site int) bool) {
	p := f.st.p
	for s := range f.st.climates {
		state := -1
		if now != nil {
			state = 0
			if now(s) {
				state = 1
			}
		}
		n := int(f.st.first + int64(f.st.hours) - hour)
		if n <= 0 {
			continue
		}
		f.st.climates[s].Forecast(f.prob[:n], hour, state)
		for _, t := range f.st.Survey.Sites[s].Telescopes {
			for k := range p.Nights {
				sn := &f.st.nights[t*p.Nights+k]
				for b := range sn.blocks {
					if i := sn.hour + int64(b) - hour; i >= 0 && i < int64(n) {
						f.chance[sn.block+b] = f.prob[i]
					}
				}
			}
		}
	}
}

// assess finds each want's best option of every night from n0 on at the
// present prices.
func (f *fluid) assess(n0 int) {
	st, p := f.st, f.st.p
	for w := range p.Wants {
		if f.left[w] > 0 {
			row := f.worth[w*p.Nights : (w+1)*p.Nights]
			clear(row[n0:])
		}
	}
	for t := range p.Scopes {
		if !f.active[t] {
			continue
		}
		factor := st.climates[p.Scopes[t].Site].MeanFactor() / 255
		for n := n0; n < p.Nights; n++ {
			sn := &st.nights[t*p.Nights+n]
			price, chance := f.price[sn.block:sn.block+sn.blocks], f.chance[sn.block:sn.block+sn.blocks]
			for i := range sn.options {
				o := &sn.options[i]
				if f.left[o.want] <= 0 {
					continue
				}
				value := (p.Wants[o.want].Value + f.boost[o.want]) * factor
				busy := st.busy[int(o.want)*len(p.Scopes)+t]
				top, at := 0.0, -1
				q := st.qualities[o.at:]
				for b := int(o.from); b <= int(o.to); b++ {
					if x := (value*float64(q[b-int(o.from)]) - price[b]*busy) * chance[b]; x > top {
						top, at = x, b
					}
				}
				if at < 0 {
					continue
				}
				k := int(o.want)*p.Nights + n
				c := chance[at]
				if float32(top) > f.worth[k]*f.odds[k] || f.worth[k] == 0 {
					f.worth[k], f.odds[k] = float32(top/c), float32(c)
					f.where[k], f.who[k] = sn.block+int32(at), int16(t)
				}
			}
		}
	}
}

// choose picks each want's nights from n0 on and sets its multiplier; loads,
// when they are wanted, gather the time the picks take.
func (f *fluid) choose(n0 int, loads bool) {
	st, p := f.st, f.st.p
	if loads {
		clear(f.load)
	}
	for w := range p.Wants {
		if f.left[w] <= 0 {
			f.mu[w] = 0
			continue
		}
		row := w * p.Nights
		f.mu[w] = f.multiplier(w, n0)
		if !loads {
			continue
		}
		often := float64(st.often[w])
		for n := n0; n < p.Nights; n++ {
			if f.take[n] && f.worth[row+n] > 0 {
				f.load[f.where[row+n]] += often * st.busy[w*len(p.Scopes)+int(f.who[row+n])]
			}
		}
	}
}

// renew sets the multipliers of wants for nights from n0 on: of those that had
// a visit since, and of a quarter of the others each evening; between two
// evenings the worth of what is left hardly changes.
func (f *fluid) renew(n0 int, visited func(w int) bool) {
	for w := range f.left {
		if f.left[w] > 0 && ((w+n0)%4 == 0 || visited(w)) {
			f.mu[w] = f.multiplier(w, n0)
		}
	}
}

// multiplier finds mu such that the nights worth more than mu hold, by their
// chances, as many visits as are left; 0 when all of them hold fewer. It
// leaves the picked nights in take.
func (f *fluid) multiplier(w, n0 int) float64 {
	row := f.worth[w*f.st.p.Nights : (w+1)*f.st.p.Nights]
	top := float32(0)
	for _, x := range row[n0:] {
		top = max(top, x)
	}
	left := float64(f.left[w])
	if f.pick(w, n0, 0) <= left {
		return 0
	}
	lo, hi := 0.0, float64(top)
	for range 7 {
		mid := (lo + hi) / 2
		if f.pick(w, n0, mid) > left {
			lo = mid
		} else {
			hi = mid
		}
	}
	f.pick(w, n0, hi)
	return hi
}

// pick chooses nights worth more than mu, at least spread apart, and returns
// the visits they hold by their chances. Within a spread a failed attempt can
// be made again: the chance of a pick is that of one open night among them.
func (f *fluid) pick(w, n0 int, mu float64) float64 {
	st := f.st
	nights := st.p.Nights
	row, odds := f.worth[w*nights:(w+1)*nights], f.odds[w*nights:(w+1)*nights]
	spread, often := int(st.spread[w]), float64(st.often[w])
	sum := 0.0
	if spread == 1 {
		for n := n0; n < nights; n++ {
			f.take[n] = float64(row[n]) > mu
			if f.take[n] {
				sum += float64(odds[n]) * often
			}
		}
		return sum
	}
	// best[n]: the most from nights n on.
	best := f.best[:nights+1]
	best[nights] = 0
	for n := nights - 1; n >= n0; n-- {
		g := 0.0
		if float64(row[n]) > mu {
			g = (float64(row[n]) - mu) * float64(odds[n])
		}
		f.gain[n] = g + best[min(n+spread, nights)]
		best[n] = max(best[n+1], f.gain[n])
	}
	for n := n0; n < nights; {
		f.take[n] = false
		if float64(row[n]) > mu && f.gain[n] >= best[n+1] {
			f.take[n] = true
			closed := 1.0
			for range spread {
				closed *= 1 - float64(odds[n])
			}
			sum += 1 - closed
			for k := n + 1; k < min(n+spread, nights); k++ {
				f.take[k] = false
			}
			n += spread
			continue
		}
		n++
	}
	return sum
}

// step moves the prices of the hours of nights from n0 on by relative excess
// demand.
func (f *fluid) step(n0 int, eta, memory float64) {
	st, p := f.st, f.st.p
	f.assess(n0)
	f.choose(n0, true)
	for t := range p.Scopes {
		if !f.active[t] {
			continue
		}
		for n := n0; n < p.Nights; n++ {
			sn := &st.nights[t*p.Nights+n]
			for b := sn.block; b < sn.block+sn.blocks; b++ {
				c := st.capacity[b]
				if c <= 0 {
					continue
				}
				x := max(-1, min(1.5, (f.load[b]-c)/c))
				f.drift[b] = memory*f.drift[b] + (1-memory)*x
				f.price[b] = max(0, f.price[b]+eta*st.rate*f.drift[b])
			}
		}
	}
}

// The steps of a solve from scratch and of a nightly one: a few are enough
// where the prices of the evening before are at hand.
const (
	firstSteps   = 60
	firstEta     = 0.3
	firstLast    = 0.02
	nightlySteps = 4
	nightlyEta   = 0.03
)

// solve prices a whole season from no prices at all, with the climate alone.
func (f *fluid) solve() {
	for b := range f.price {
		f.price[b] = 0.4 * f.st.rate
	}
	f.know(f.st.first, nil)
	for k := range firstSteps {
		f.step(0, firstEta*math.Pow(firstLast/firstEta, float64(k)/(firstSteps-1)), 0.5)
	}
	f.assess(0)
	f.choose(0, false)
}

// again prices the nights from n0 on once more.
func (f *fluid) again(n0 int) {
	for range nightlySteps {
		f.step(n0, nightlyEta, 0.3)
	}
	f.assess(n0)
}
