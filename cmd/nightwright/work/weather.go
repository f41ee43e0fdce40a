package work

import (
	"errors"
	"os"

	"nightwright/scenarios/surveyfile"
	"nightwright/scenarios/weather"
)

// FitWeather fits a site's weather to a record in a CSV file.
func FitWeather(path string, cols weather.Columns) (*weather.Fit, error) {
	f, err := os.Open(path)
	if err != nil {
		var p *os.PathError
		if errors.As(err, &p) {
			err = p.Err
		}
		return nil, Inputf("%s: %v; want a weather record as CSV", path, err)
	}
	defer f.Close()
	rec, err := weather.Read(path, f, cols)
	if err != nil {
		return nil, &InputError{Issues: rowIssues(err), What: err.Error(), Of: "record"}
	}
	return weather.FitRecord(rec), nil
}

// rowIssues turns the faults of a record into issues with their places.
func rowIssues(err error) []surveyfile.Issue {
	var list []surveyfile.Issue
	all := []error{err}
	if many, ok := err.(interface{ Unwrap() []error }); ok {
		all = many.Unwrap()
	}
	for _, e := range all {
		var row *weather.RowError
		if errors.As(e, &row) {
			list = append(list, surveyfile.Issue{File: row.File, Line: row.Line, What: row.What, Want: row.Want})
		}
	}
	return list
}
