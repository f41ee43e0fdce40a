package dual

// pool hands scratch memory to workers.
type pool struct{ free chan *scratch }

func newPool(workers int, make_ func() *scratch) *pool {
	p := &pool{free: make(chan *scratch, max(1, workers))}
	for range max(1, workers) {
		p.free <- make_()
	}
	return p
}

func (p *pool) get() *scratch  { return <-p.free }
func (p *pool) put(s *scratch) { p.free <- s }
