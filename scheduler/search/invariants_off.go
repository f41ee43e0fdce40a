//go:build !invariants

package search

// invariants turns on the recount of the score after every move; build with
// the tag of the same name.
const invariants = false
