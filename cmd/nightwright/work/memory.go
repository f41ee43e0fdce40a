package work

import (
	"fmt"

	"nightwright/scheduler"
)

// memoryTold is the need from which on it is told, bytes: below it any machine
// will do.
const memoryTold = 400 << 20

// MemoryNote says how much memory planning takes, or is "" when that is little.
func (s *Survey) MemoryNote() string {
	n := scheduler.EstimateBytes(s.Survey)
	if n < memoryTold {
		return ""
	}
	return fmt.Sprintf("planning this survey needs about %.1f GB of memory", float64(n)/(1<<30))
}
