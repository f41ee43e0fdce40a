// Package draw makes the pictures of reports and pages: maps of the sky,
// calendars, nights, curves and bars. A picture is a Canvas: a list of shapes
// in inks, which are roles rather than colours, so that the same picture is
// right on light and on dark paper. It is written as SVG, to stand in a page
// or alone, or as PNG.
//
// The functions take plain numbers and know no tables, files or clocks.
// Coordinates are pixels, y downwards; angles radians, instants UTC Unix
// seconds. The same input gives the same bytes.
package draw
