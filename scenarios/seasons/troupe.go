package seasons

import (
	"context"
	"sync"

	"nightwright/scheduler/model"
)

// Cast says who plays: a policy over a set of sites, against which prices.
type Cast struct {
	Policy Policy
	Sites  []int              // nil: all
	List   []model.Exposure   // AsPlanned: the plan
	Prices []model.Price      // FixedPrices: the plan's; nil: prices of the expected weather
	Record bool               // keep the exposures taken
	Bins   bool               // sort the credit by declination, month and Moon
	Down   func(k int) Outage // shuts a site in season k; nil: never
}

// Outage shuts a site for the nights From, From+1, ... To-1 of a season.
type Outage struct{ Site, From, To int }

// Troupe plays seasons with one cast. Players are made as they are needed, one
// a worker; what they share is made once.
type Troupe struct {
	st    *Stage
	cast  Cast
	base  *fluid
	lists *planned
	bins  *binning
}

// NewTroupe works out what a cast's players share: prices before the season.
func NewTroupe(st *Stage, cast Cast) *Troupe {
	t := &Troupe{st: st, cast: cast, base: newFluid(st, st.scopesOf(cast.Sites))}
	for f := range len(st.p.FieldWant) - 1 {
		wanted := st.Survey.Wanted(&st.Survey.Fields[f])
		for w := st.p.FieldWant[f]; w < st.p.FieldWant[f+1]; w++ {
			t.base.boost[w] = st.p.Bonus(f) / float64(wanted)
		}
	}
	switch cast.Policy {
	case AsPlanned:
		t.lists = newPlanned(st, cast.List)
	case FixedPrices, Resolved:
		if cast.Prices != nil && cast.Policy == FixedPrices {
			t.base.takePrices(cast.Prices)
		} else {
			t.base.solve()
		}
	}
	if cast.Bins {
		t.bins = newBinning(st)
	}
	return t
}

// takePrices sets the prices of a plan: those of its slots, averaged over hours.
func (f *fluid) takePrices(list []model.Price) {
	st := f.st
	count := make([]int, st.blocks)
	clear(f.price)
	starts := make([]map[int64]int32, len(st.p.Scopes))
	for t := range starts {
		starts[t] = map[int64]int32{}
		for n := range st.p.Nights {
			sn := &st.nights[t*st.p.Nights+n]
			for b := range sn.blocks {
				starts[t][sn.hour+int64(b)] = sn.block + b
			}
		}
	}
	for _, x := range list {
		if b, ok := starts[x.Telescope][x.SlotStart/blockTime]; ok {
			f.price[b] += x.PerHour / 3600
			count[b]++
		}
	}
	for b, n := range count {
		if n > 0 {
			f.price[b] /= float64(n)
		}
	}
	f.know(st.first, nil)
	f.assess(0)
	f.choose(0, false)
}

// player makes one worker's player.
func (t *Troupe) player() *Player {
	pl := newPlayer(t.st, t.cast.Policy, t.base.active, t.base, t.lists)
	pl.record, pl.bins = t.cast.Record, t.bins
	return pl
}

// Play plays the seasons from, from+1, ... to-1 of a seed and hands their
// outcomes to fold, in order, one at a time. Memory doesn't depend on their
// number. It errs only when ctx ends.
func (t *Troupe) Play(ctx context.Context, seed uint64, from, to, workers int, fold func(*Outcome)) error {
	workers = max(1, min(workers, to-from))
	players := make([]*Player, workers)
	batch := make([]*Outcome, 4*workers)
	for at := from; at < to; at += len(batch) {
		n := min(len(batch), to-at)
		var wg sync.WaitGroup
		var mu sync.Mutex
		next := 0
		for w := range workers {
			wg.Add(1)
			go func() {
				defer wg.Done()
				if players[w] == nil {
					players[w] = t.player()
				}
				for ctx.Err() == nil {
					mu.Lock()
					k := next
					next++
					mu.Unlock()
					if k >= n {
						return
					}
					pl := players[w]
					pl.down = outage{site: -1}
					if t.cast.Down != nil {
						d := t.cast.Down(at + k)
						pl.down = outage{d.Site, int32(d.From), int32(d.To)}
					}
					batch[k] = pl.Play(seed, at+k)
				}
			}()
		}
		wg.Wait()
		if err := ctx.Err(); err != nil {
			return err
		}
		for k := range n {
			fold(batch[k])
			batch[k] = nil
		}
	}
	return nil
}
