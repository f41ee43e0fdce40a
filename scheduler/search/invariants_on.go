//go:build invariants

package search

const invariants = true
