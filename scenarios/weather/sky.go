package weather

import (
	"crypto/sha256"
	"encoding/binary"
	"math/rand/v2"
)

// Sky is one realisation of the weather over all sites: a state for each site
// and hour. Its memory is used again by the next Draw; it isn't safe for
// concurrent use while it is drawn.
type Sky struct {
	climates []Climate
	first    int64 // hour number of index 0
	hours    int
	states   []uint8     // [site*hours + hour]: 0 closed, 1 open at its best, 2+i level i
	factors  [][]float64 // [site][state]
	regions  []string
	common   []uniforms // [region*hours + hour]
}

// uniforms are the draws of an hour: whether the state is kept, and the new
// one.
type uniforms struct{ keep, state float64 }

// NewSky makes room for realisations of the given sites over the hours
// first, first+1, ... (hours since 1970, UTC). Nothing is drawn yet.
func NewSky(climates []Climate, first int64, hours int) *Sky {
	s := &Sky{climates: climates, first: first, hours: hours, states: make([]uint8, len(climates)*hours)}
	for i := range climates {
		c := &climates[i]
		f := []float64{0, 1}
		for _, v := range c.Levels {
			f = append(f, Factor(v))
		}
		s.factors = append(s.factors, f)
		if c.Region != "" && s.region(c.Region) < 0 {
			s.regions = append(s.regions, c.Region)
		}
	}
	s.common = make([]uniforms, len(s.regions)*hours)
	return s
}

func (s *Sky) region(name string) int {
	for i, r := range s.regions {
		if r == name {
			return i
		}
	}
	return -1
}

// stream returns the generator of one name of a kind ("site", "region") in one
// realisation. The key is hashed, so that streams of neighbours share nothing.
func stream(kind, name string, seed, realisation uint64) *rand.Rand {
	var n [16]byte
	binary.LittleEndian.PutUint64(n[:8], seed)
	binary.LittleEndian.PutUint64(n[8:], realisation)
	h := sha256.New()
	h.Write(n[:])
	h.Write([]byte(kind))
	h.Write([]byte{0})
	h.Write([]byte(name))
	var sum [sha256.Size]byte
	h.Sum(sum[:0])
	return rand.New(rand.NewPCG(binary.LittleEndian.Uint64(sum[:8]), binary.LittleEndian.Uint64(sum[8:16])))
}

// Draw makes the sky of one realisation. Every hour takes the same number of
// draws, so that a site's numbers don't move its stream.
func (s *Sky) Draw(seed, realisation uint64) {
	for k, name := range s.regions {
		rg := stream("region", name, seed, realisation)
		row := s.common[k*s.hours : (k+1)*s.hours]
		for i := range row {
			row[i] = uniforms{rg.Float64(), rg.Float64()}
		}
	}
	for i := range s.climates {
		s.drawSite(i, stream("site", s.climates[i].Site, seed, realisation))
	}
}

func (s *Sky) drawSite(i int, rg *rand.Rand) {
	c := &s.climates[i]
	var common []uniforms
	follow := c.follow()
	if k := s.region(c.Region); k >= 0 && c.Region != "" {
		common = s.common[k*s.hours : (k+1)*s.hours]
	}
	r, rl := c.Keep(), Keep(c.LevelPersistence, hour)
	row := s.states[i*s.hours : (i+1)*s.hours]
	open, level := false, uint8(1)
	for k := range row {
		own, which := uniforms{rg.Float64(), rg.Float64()}, rg.Float64()
		lv := uniforms{rg.Float64(), rg.Float64()}
		if common != nil && which < follow {
			own = common[k]
		}
		// The first hour is drawn from the stationary shares.
		if k == 0 || own.keep >= r {
			open = own.state < c.Clear[Month(s.first+int64(k))]
		}
		if k == 0 || lv.keep >= rl {
			level = c.level(lv.state)
		}
		row[k] = 0
		if open {
			row[k] = level
		}
	}
}

// level turns a uniform number into a state of the open sky.
func (c *Climate) level(u float64) uint8 {
	for i, v := range c.Levels {
		if u < v.Share {
			return uint8(2 + i)
		}
		u -= v.Share
	}
	return 1
}

// First returns the number of the first hour, hours since 1970, UTC.
func (s *Sky) First() int64 { return s.first }

// Hours returns the number of hours.
func (s *Sky) Hours() int { return s.hours }

// Open reports whether the sky of a site is open in an hour (hours since
// 1970). Hours outside the realisation are closed.
func (s *Sky) Open(site int, h int64) bool {
	k := h - s.first
	return k >= 0 && k < int64(s.hours) && s.states[site*s.hours+int(k)] != 0
}

// Factor returns what the sky of a site makes of quality in an hour: 0 while
// it is closed, 1 at its best.
func (s *Sky) Factor(site int, h int64) float64 {
	k := h - s.first
	if k < 0 || k >= int64(s.hours) {
		return 0
	}
	return s.factors[site][s.states[site*s.hours+int(k)]]
}
