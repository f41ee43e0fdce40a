package search

import (
	"fmt"

	"nightwright/scheduler/model"
)

// verify recounts the state from its entries and panics when the running
// score, the visits' records or the order of a night disagree.
func (s *state) verify() {
	var score int64
	steps := map[int32]int{}
	credit := map[int32]int64{}
	for i := range s.nights {
		n := &s.nights[i]
		for k := range n.list {
			e := &n.list[k]
			score += e.credit
			steps[e.visit]++
			credit[e.visit] += e.credit
			if e.start < e.early || e.start > e.late {
				panic(fmt.Sprintf("search: entry at %d outside its window [%d, %d]", e.start, e.early, e.late))
			}
			given := k > 0 && s.visits[e.visit].fixed && s.visits[n.list[k-1].visit].fixed
			if k > 0 && !given && n.list[k-1].end()+n.gap[k] > e.start {
				panic(fmt.Sprintf("search: telescope-night %d: gap before entry %d is too short", i, k))
			}
		}
	}
	got := make([]int32, len(s.got))
	for w := range s.of {
		for _, id := range s.of[w] {
			v := &s.visits[id]
			if !v.alive || int(v.want) != w || steps[id] != len(s.p.Wants[w].Steps) || credit[id] != v.credit {
				panic(fmt.Sprintf("search: visit %d of want %d is recorded wrongly", id, w))
			}
			got[s.p.Wants[w].Field]++
		}
	}
	for f := range got {
		if got[f] != s.got[f] {
			panic(fmt.Sprintf("search: field %d has %d visits, %d noted", f, got[f], s.got[f]))
		}
		if got[f] == s.wanted[f] {
			score += s.bonus[f]
		}
	}
	time := make([]int64, len(s.time))
	for i, sec := range s.p.GivenSeconds {
		time[i] = model.MicroOf(sec)
	}
	for i := range s.nights {
		for k := range s.nights[i].list {
			e := &s.nights[i].list[k]
			if s.visits[e.visit].fixed {
				continue // among the given seconds
			}
			time[s.p.Wants[e.want].Program] += e.length
		}
	}
	for p := range time {
		if time[p] != s.time[p] {
			panic(fmt.Sprintf("search: program %d has %d us of exposure, %d noted", p, time[p], s.time[p]))
		}
	}
	if score != s.score {
		panic(fmt.Sprintf("search: score is %d, the recount %d", s.score, score))
	}
}
