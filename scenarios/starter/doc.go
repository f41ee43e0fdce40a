// Package starter writes survey folders to begin with, and makes families of
// surveys to try an optimiser on. All places in them are invented.
//
// A starter is the same bytes each time it is written: its fields come from
// a numbered random stream, and its text from a template in which only the
// numbers of visits follow the demand that is asked for.
package starter
