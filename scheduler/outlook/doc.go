// Package outlook weighs what a survey asks for against what its sites have,
// before anything is planned: hours by site and month, demand against supply
// by right ascension, what each rule takes away, and what can't be done at
// all. It looks at each field as if it were alone: what it calls impossible
// is impossible for every plan; what it lets pass may still lose to others.
//
// Hours are float64 hours, angles radians, months counted from the period's
// first.
package outlook
