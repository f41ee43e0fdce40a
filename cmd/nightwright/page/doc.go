// Package page is the planning page: a server on this machine that shows a
// survey's plan night by night, takes marks of lost time, plans again, and
// shows what would move before anything is accepted. Its jobs are those of the
// commands (package work); its state is the survey folder and its ledger.
//
// It is safe to leave open: it answers to this machine's own names alone,
// changes nothing by GET, wants a key for every change, and bounds what it
// reads. Instants in its JSON are UTC Unix seconds, angles degrees unless a
// name says rad.
package page
