// Package tables turns a plan into rows and back: the row types of every
// table, Parquet and CSV in and out, the plan folder and its summary, and the
// recount of coverage on the exact path. It alone knows the Parquet library.
//
// Units are those of the column names: degrees, seconds, hours, days;
// instants are UTC Unix microseconds, nights are days since 1970-01-01.
// Nothing here depends on the clock or the machine: the same rows give the
// same bytes.
package tables
