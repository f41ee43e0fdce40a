// Package seasons plays seasons out under simulated weather: what a plan, or
// a way of acting on it, gets when clouds come, and which network of sites
// gets more.
//
// A Stage holds what all seasons of a survey share. A Player runs seasons on
// it, one at a time, in memory that is used again: each telescope acts in real
// time, knows the sky of the present hour and nothing of the next, and takes
// the visit that is worth most of the time it needs. Every visit that counts
// is legal for the survey with the closed hours taken as lost time, and whole
// within open sky; an audit of it finds no breach.
//
// Seasons are numbered; season k of a seed has the same sky whoever plays it,
// so that policies and networks are compared in pairs. Results are folded in
// the order of their numbers: any number of workers or shards gives the same
// bytes.
//
// Units: C (coverage, 0 to 1), seconds, UTC. Instants are Unix microseconds
// inside a night. The package prints nothing and reads no clock.
package seasons
