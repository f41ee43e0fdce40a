// Package model holds what the scheduler works on and what it returns: the
// immutable Problem, the honest Plan, and the Outcome of a search. It knows
// no files, terminals or clocks.
package model
