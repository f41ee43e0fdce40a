// Package report makes the report of a plan: the numbers and pictures that a
// committee decides by, in one page that needs no network and no scripts.
// Every number comes from the plan's tables and the survey they were made
// from; no clock is read, so that the same plan gives the same bytes.
//
// Angles are radians inside and degrees in the tables, instants UTC.
package report
