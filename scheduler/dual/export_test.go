package dual

// SetRates sets every price, in C per second, for the tests of the bound.
func (a *Ascent) SetRates(rate func(scope, slot int) float64) {
	n := a.prices.n
	for i := range a.prices.rate {
		k := a.prices.slotOf(i)
		a.prices.rate[i] = rate(k/n, k%n)
	}
	a.prices.integrate()
}

// SetMu sets the count multipliers from which the bound's search starts.
func (a *Ascent) SetMu(mu func(want int) float64) {
	for i := range a.oracle.Mu {
		a.oracle.Mu[i] = mu(i)
	}
}

// Prove makes the oracle prove, as Ceiling does.
func (a *Ascent) Prove(width float64) {
	a.oracle.Fine(width)
	a.oracle.Refresh()
}

// WantBound bounds what one want can earn on its own at the current prices.
func (a *Ascent) WantBound(want int) float64 {
	b, _ := a.oracle.best(a.oracle.newScratch(), want, nil)
	return b
}

// PricedValue is the rest of the ceiling: what the capacity is worth.
func (a *Ascent) PricedValue() float64 { return a.capacityValue() - a.keepFreeValue() }

// AddCapacity gives a telescope more seconds in a slot, on paper: the proof's
// capacity grows, the open time doesn't.
func (a *Ascent) AddCapacity(scope int, slotStart int64, seconds float64) {
	s := slotStart*1_000_000/a.prices.slot - a.prices.first
	a.prices.capacity[scope*a.prices.n+int(s)] += seconds
}

// SetRatesAt sets every price by the slot's start, Unix s.
func (a *Ascent) SetRatesAt(rate func(scope int, slotStart int64) float64) {
	a.SetRates(func(scope, slot int) float64 {
		return rate(scope, (a.prices.first+int64(slot))*a.prices.slot/1_000_000)
	})
}

// SetShareRates sets the multipliers of the share bounds, C per second, by
// program: of the minimum and of the maximum.
func (a *Ascent) SetShareRates(rate func(program int) (low, high float64)) {
	for i := range a.shares.low {
		a.shares.low[i], a.shares.high[i] = rate(i)
	}
	a.shares.rates(a.oracle.Share)
}
