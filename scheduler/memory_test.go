package scheduler_test

import (
	"testing"

	"nightwright/scenarios/starter"
	"nightwright/scheduler"
)

// TestEstimateBytesFollowsTheSize checks the estimate against what was measured
// (resident memory of planning, quick effort, 2026-12-01) within its factor,
// and that it grows with the nights.
func TestEstimateBytesFollowsTheSize(t *testing.T) {
	sv := starter.Family("medium", 1)
	const measured = 115e6
	if got := float64(scheduler.EstimateBytes(sv)); got < measured/1.6 || got > measured*1.6 {
		t.Errorf("medium: estimated %.0f MB, measured %.0f MB", got/1e6, measured/1e6)
	}
	short := scheduler.EstimateBytes(sv)
	sv.LastNight += 3650
	if long := scheduler.EstimateBytes(sv); long < 20*short {
		t.Errorf("ten years more: %d MB after %d MB", long>>20, short>>20)
	}
}
