package dual

import (
	"nightwright/scheduler/model"
)

// NewAscentAt starts from prices that were worked out before, for this problem
// or one much like it; slots that they don't name cost nothing. Any prices make
// a ceiling, good ones a tight one.
func NewAscentAt(p *model.Problem, prices []model.Price) *Ascent {
	a := NewAscent(p)
	a.prices.set(prices)
	return a
}

// set takes prices of slots in, for the pieces of cut slots too.
func (pr *Prices) set(list []model.Price) {
	for _, x := range list {
		s := floorDiv(x.SlotStart*model.Micro, pr.slot) - pr.first
		if x.Telescope < 0 || int(x.Telescope) >= len(pr.p.Scopes) || s < 0 || s >= int64(pr.n) || !(x.PerHour > 0) {
			continue
		}
		pr.rate[int(x.Telescope)*pr.n+int(s)] = x.PerHour / 3600
	}
	base := len(pr.p.Scopes) * pr.n
	for i, k := range pr.parts {
		pr.rate[base+i] = pr.rate[k]
	}
	pr.integrate()
}

// StartMu gives the wants' count multipliers a start: what each want's last visit
// is worth over the price of its time, C. It speeds the ceiling up and leaves it
// one whatever the values.
func (a *Ascent) StartMu(mu []float64) { copy(a.oracle.Mu, mu) }
