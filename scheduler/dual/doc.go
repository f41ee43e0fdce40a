// Package dual puts prices on telescope time and proves the ceiling: for any
// prices of at least 0 on each telescope's slots, capacity times price plus the
// best that each field's demands can do alone against those prices bounds the
// coverage of every legal plan from above (Lagrangian relaxation; Geoffrion
// 1974, Fisher 1981). Prices are in C per hour, instants in UTC Unix
// microseconds. It knows nothing of the search.
package dual
