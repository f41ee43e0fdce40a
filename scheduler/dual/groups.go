package dual

import (
	"math"

	"nightwright/scheduler/model"
)

// move moves every price by its slot's and its groups' excess, in units of the
// local worth. Where keep_free leaves a night less than its open time, the night
// has a price of its own, under which no slot of it falls: what keepFreeValue
// takes back.
func (a *Ascent) move(groups []*group, eta float64) {
	pr := a.prices
	keep := a.keepFactor()
	for i := range pr.nights {
		pn := &pr.nights[i]
		base, whole := a.base[i], keep[i/a.p.Nights] < 1
		if whole && len(pn.slots) > 0 {
			g := groups[len(groups)-1]
			s := pn.slots[0]
			a.base[i] = math.Max(0, base+eta*a.unit[s]*(g.step[g.of[s]]*g.velocity[g.of[s]]+drift(groups[1:len(groups)-1], pn, g.velocity[g.of[s]] <= 0)))
		}
		for j, s := range pn.slots {
			if !pn.open[j] || pr.capacity[s] <= 0 {
				continue
			}
			own := groups[0].velocity[groups[0].of[s]]
			d := groups[0].step[groups[0].of[s]] * own
			for _, g := range groups[1:] {
				// Idle time elsewhere is no reason to sell a crowded hour cheap.
				if v := g.velocity[g.of[s]]; !whole && (v > 0 || own <= 0) {
					d += g.step[g.of[s]] * v
				}
			}
			pr.rate[s] = a.base[i] + math.Max(0, pr.rate[s]-base+eta*a.unit[s]*d)
		}
	}
}

// group is the slots gathered in blocks, with each block's capacity and the
// running mean of its relative excess demand.
type group struct {
	of       []int32
	capacity []float64
	load     []float64
	velocity []float64
	step     []float64 // own gain, shrinking when the excess changes sign
	most     float64
	memory   float64
}

// move takes the loads of a step in.
func (g *group) move(load []float64) {
	clear(g.load)
	for s, x := range load {
		if x != 0 {
			g.load[g.of[s]] += x
		}
	}
	for b, c := range g.capacity {
		if c > 0 {
			x := math.Max(-1, math.Min(1.5, (g.load[b]-c)/c))
			v := g.memory*g.velocity[b] + (1-g.memory)*x
			if v*g.velocity[b] < 0 {
				g.step[b] *= 0.6
			} else {
				g.step[b] = math.Min(g.step[b]*1.05, g.most)
			}
			g.velocity[b] = v
		}
	}
}

// group assigns each slot to its block: telescope, group of nights, and
// sidereal hours.
func (a *Ascent) group(bl block, memory float64) *group {
	pr := a.prices
	g := &group{of: make([]int32, len(pr.rate)), most: bl.gain, memory: memory}
	n := a.assign(g.of, bl)
	g.capacity, g.load, g.velocity = make([]float64, n), make([]float64, n), make([]float64, n)
	g.step = make([]float64, n)
	for i := range g.step {
		g.step[i] = bl.gain
	}
	keep := a.keepFactor()
	for s, c := range pr.capacity {
		if c > 0 {
			part := keep[pr.slotOf(s)/pr.n]
			if bl.hours == 0 {
				part = 1 // keep_free is the night's business
			}
			g.capacity[g.of[s]] += c * part
		}
	}
	return g
}

// assign fills of with block numbers and returns how many there are.
func (a *Ascent) assign(of []int32, bl block) int {
	pr := a.prices
	if bl.hours == 0 {
		for s := range of {
			of[s] = int32(s)
		}
		return len(of)
	}
	perDay := int(math.Ceil(24 / bl.hours))
	nights := bl.nights
	if nights == 0 {
		nights = a.p.Nights + 4
	}
	groups := (a.p.Nights+2)/nights + 2
	for t := range a.p.Scopes {
		row := t
		if bl.network {
			row = 0
		}
		lon := a.p.Survey.Sites[a.p.Scopes[t].Site].Longitude
		for s := range pr.n {
			us := (pr.first+int64(s))*pr.slot + pr.slot/2
			local := model.Sec(us) - 43200 + lon/(2*math.Pi)*86400
			night := int(math.Floor(local/86400)) - int(a.p.Survey.FirstNight) + 1
			group := min(max(night/nights, 0), groups-1)
			// Sidereal time to a minute or so is enough to group slots.
			lst := math.Mod(model.Sec(us)/86164.0905+lon/(2*math.Pi), 1)
			if lst < 0 {
				lst++
			}
			h := min(int(lst*24/bl.hours), perDay-1)
			of[t*pr.n+s] = int32((row*groups+group)*perDay + h)
		}
	}
	for i, k := range pr.parts {
		of[len(a.p.Scopes)*pr.n+i] = of[k]
	}
	return len(a.p.Scopes) * groups * perDay
}
