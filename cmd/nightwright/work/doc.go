// Package work holds the program's jobs: one function a job, each with a
// context, options, a progress callback and a result that a terminal or a
// page can show. It knows no terminal, no flags and no exit codes. Jobs that
// write do so at their end and whole: a job that fails or is interrupted
// leaves what stood before.
//
// Units in results: angles in degrees, instants UTC, durations in hours: this
// is the edge of the house.
package work
