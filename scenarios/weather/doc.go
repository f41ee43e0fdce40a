// Package weather draws skies: for each site, hour by hour, open or closed,
// and how good an open sky is. It also fits a site's numbers to a record.
//
// The model is a chain of two states in steps of an hour. With r =
// exp(-1 h / persistence), the sky of an hour is that of the hour before with
// probability r and drawn afresh with probability 1 - r, open with the month's
// clear fraction p. So the share of open hours is p, the correlation of two
// hours k apart is r^k, and runs of open hours are geometric with mean
// 1 / ((1 - r)(1 - p)) (elementary theory of Markov chains; Kemeny & Snell
// 1960, chapter 4).
//
// Sites of a region follow, each with a probability of its own in each hour,
// one common set of draws; that keeps every site's own chain as it is.
//
// Every site draws from a stream of its own, keyed by the seed, the number of
// the realisation and the site's name: adding, removing or moving sites leaves
// the skies of the others as they were. Hours are UTC.
//
// The package reads no files by name, knows no fields and no telescopes, and
// reads no clock.
package weather
