// Package formats writes plans in the open formats that other tools read:
// VOTable 1.4, ECSV 1.0, iCalendar (RFC 5545), the planned-observation table
// of ObsLocTAP 1.0, and the sky that a plan covers.
//
// Everything written is a function of the plan and a stamp that the caller
// gives: no clock is read, and the same plan and stamp give the same bytes.
// Angles are degrees here, instants UTC: this is the edge of the house.
//
// Sources: IVOA recommendations VOTable 1.4 (2019-10-21) and ObsLocTAP 1.0
// (2021-07-24); Astropy proposal for enhancement 6 (ECSV 1.0); RFC 5545.
package formats
