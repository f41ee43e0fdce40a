package search

import "sort"

// The cost of a push. When entry i has to start d later, entry j >= i moves
// by d less the idle time between them: d_j = max(0, d - (idle[j] - idle[i])),
// idle being the running sum of idle time. With J the first entry that stays,
//
//	sum slope_j d_j = (d + idle[i]) (slope[J] - slope[i]) - (moment[J] - moment[i]),
//
// slope and moment running sums of slope_j and slope_j idle[j]; a binary
// search and four look-ups. To the left it is the mirror image.

// pushRight returns the change of score when list[i] and what follows must
// start d us later.
func (n *night) pushRight(i int, d int64) float64 {
	m := len(n.list)
	if i >= m || d <= 0 {
		return 0
	}
	x := float64(d) + n.idle[i]
	j := i + sort.Search(m-i, func(k int) bool { return n.idle[i+k] >= x })
	return x*(n.slope[j]-n.slope[i]) - (n.moment[j] - n.moment[i])
}

// pushLeft returns the change of score when list[i] and what precedes must
// start d us earlier.
func (n *night) pushLeft(i int, d int64) float64 {
	if i < 0 || d <= 0 {
		return 0
	}
	x := n.idle[i] - float64(d)
	j := sort.Search(i, func(k int) bool { return n.idle[k] > x })
	// list[j..i] move by idle[k] - x each.
	return x*(n.slope[i+1]-n.slope[j]) - (n.moment[i+1] - n.moment[j])
}
