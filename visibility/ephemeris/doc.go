// Package ephemeris holds time scales, Earth rotation, precession, nutation,
// the Earth's motion, and the Sun and Moon: pure functions, each with its
// source, units, error and years of validity. It knows no sites and no fields.
package ephemeris
