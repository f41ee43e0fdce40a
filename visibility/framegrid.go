package visibility

import "math"

// FrameGrid is the frames of one site over one night at equal steps, with the
// light terms of every filter: what a loop over many fields shares. Memory:
// about 190 bytes and 16 more a filter for each step.
type FrameGrid struct {
	From    float64 // UTC, Unix s, of the first frame; a multiple of Step
	Step    float64 // s
	Frames  []Frame
	filters int
	lights  []Light     // [frame][filter]
	nodes   []nodeFloor // [frame][filter], see NodeQuality
}

// FrameGrid builds the frames from the last multiple of step at or before
// from to the first at or after to.
func (s *Sky) FrameGrid(site int, from, to, step float64) *FrameGrid {
	first := math.Floor(from/step) * step
	n := int(math.Ceil((to-first)/step)) + 1
	if n < 2 {
		n = 2
	}
	g := &FrameGrid{From: first, Step: step, filters: len(s.filters)}
	g.Frames = make([]Frame, n)
	g.lights = make([]Light, n*g.filters)
	for k := range g.Frames {
		g.Frames[k] = s.Frame(site, first+float64(k)*step)
		for f := range g.filters {
			g.lights[k*g.filters+f] = s.Light(&g.Frames[k], f)
		}
	}
	g.setNodes(s)
	return g
}

// Light returns the light terms of a filter at frame k.
func (g *FrameGrid) Light(k, filter int) Light { return g.lights[k*g.filters+filter] }

// Cells returns the number of cells between frames.
func (g *FrameGrid) Cells() int { return len(g.Frames) - 1 }

// Cell returns the index of the cell that holds an instant, within the grid.
func (g *FrameGrid) Cell(unix float64) int {
	k := int((unix - g.From) / g.Step)
	if k < 0 {
		return 0
	}
	if k > len(g.Frames)-2 {
		return len(g.Frames) - 2
	}
	return k
}
