// Package footprint goes from a region on the sky to a list of fields, and
// describes regions as sets of HEALPix cells.
//
// It holds a nested HEALPix indexer (all orders 0 to 29), multi-order
// coverage maps (MOC 2.0: ASCII and JSON), regions on the sphere (bands,
// boxes, circles, polygons, strips, maps, exclusions), the reader of region
// files, and a tiling of regions by circular fields that leaves no gap.
//
// Angles are radians, positions ICRS; degrees stand in files alone. Nothing
// here prints, exits, or reads the clock or the environment, and the same
// input gives the same output to the byte.
package footprint
