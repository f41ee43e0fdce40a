package work

import (
	"strings"
	"testing"

	"nightwright/scenarios/starter"
)

// TestMemoryIsToldWhenItMatters: ten years of a medium survey say so, sixty
// nights don't.
func TestMemoryIsToldWhenItMatters(t *testing.T) {
	s := &Survey{Survey: starter.Family("medium", 1)}
	if got := s.MemoryNote(); got != "" {
		t.Errorf("60 nights: %q", got)
	}
	s.LastNight += 3650
	if got := s.MemoryNote(); !strings.Contains(got, "GB of memory") {
		t.Errorf("ten years: %q", got)
	}
}
