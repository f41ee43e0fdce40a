// Package audit is the judge of a plan: it checks every exposure and every
// total afresh, from the survey alone, the slow and plain way.
//
// It knows the survey's nouns and the exact sky, and works out everything else
// by itself: nights, open time, reserved blocks, slews, rules, cadence, sets,
// counts, and each number of the tables. It shares no code with the windows,
// the kernels, the calendar, the mounts or the search, so that a fault of
// theirs can't hide here. It trusts nothing that it can work out.
//
// An exposure is tested at its start, middle and end and at least every 30 s
// between; min_quality at the middle alone.
//
// # What is forgiven
//
// Limits are tested as they stand, less what arithmetic alone can shift:
//
//   - angles: 2e-9 rad (0.0004"), the rounding of Unix seconds in float64
//     (2.4e-7 s) and of instants to microseconds, times the sky's turn;
//   - instants that the survey gives, lengths and gaps: 2 microseconds;
//   - edges that a root of the Sun's altitude fixes (first and last open
//     instant, transits) and sums of such: 1 ms.
//
// A number in a table may differ from the recomputed one by 0.1" (angles), 1e-6
// (relative: airmass, quality, credit, coverage), 1e-5 mag, 1 ms (gaps) and
// 0.1 s (hours).
//
// # What is not judged
//
// usable_hours, limited_by and prices come from the windows and the ceiling,
// and can't be had from the survey alone without building those again.
// Whether the ceiling is one is for its proof and its tests; the audit checks
// that it isn't below the coverage.
package audit
