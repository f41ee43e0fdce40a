// Package ledger keeps what really happened to a survey: exposures that were
// done, time that was lost and why, and the plans that were made. It is one
// SQLite file in the survey's folder, ledger.db.
//
// # What is promised
//
//   - All or nothing. A file of rows goes in whole, in one transaction, or
//     not at all; a process that is killed, a full disk or a power cut leaves the
//     ledger as it was before or as it is after. Rollback journal, synchronous
//     FULL: no memory shared between processes, so network file systems with
//     working locks serve, and a read-only folder can be read.
//   - Nothing is deleted or changed. A correction is a new row that replaces an
//     older one, time that was given back is a row too; triggers in the file refuse
//     anything else, whoever asks.
//   - A row that was seen before changes nothing. An exposure is known by its
//     telescope and start.
//   - One at a time. A second writer waits, and is told when it waited in vain.
//
// # The parts
//
// Read turns CSV into Rows, Ledger.Record takes them in, Ledger.Lose one
// stretch of lost time. Ledger.Done and Ledger.Losses give back what holds now,
// Credit says what it is worth to a survey, Follow whether the survey is on
// track.
//
// Instants are UTC Unix microseconds (int64) as in plans, intervals handed to
// the calendar UTC Unix seconds. The package never reads the clock: whoever
// records says when.
package ledger
