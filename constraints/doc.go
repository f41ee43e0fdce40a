// Package constraints holds the rules under which an exposure is legal, a rule
// a file: each as a plain predicate at an instant (Evaluate), and, where time
// runs over a night, as intervals. Calendar says when each telescope is open,
// Windows when each field may be observed.
//
// Angles are radians, instants UTC Unix seconds, durations seconds. The
// package knows no plans, prices, files or terminals.
package constraints
