// Package visibility says where fields, the Sun and the Moon stand over a site,
// when its nights are, and how bright its sky is. Exact is the exact path: one
// field, one instant, everything. Sky and its Frames are the fast path over a
// whole period, held against Exact by tests. Almanac, airmass, sky brightness
// and quality, coordinates and sexagesimal angles stand beside them.
//
// Angles are radians, airless and topocentric; instants are UTC Unix seconds.
// It knows no rules, telescopes, files or clocks.
package visibility
