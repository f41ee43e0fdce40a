package constraints

// poorQuality tells whether an exposure with its middle at this instant breaks
// min_quality, the one rule that is judged at the middle alone.
func poorQuality(s *Sight, limit float64) bool { return s.Quality < limit }
