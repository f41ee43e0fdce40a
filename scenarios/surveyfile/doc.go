// Package surveyfile reads a survey folder: survey.yaml, the field list it
// names, and the Earth-orientation files. It turns them into a validated
// survey.Survey, or into the list of everything that is wrong with them.
//
// Files speak degrees, hours, durations with units and ISO 8601 instants;
// the survey speaks radians, seconds and UTC Unix seconds. This package is
// the one place where a survey's numbers change from the one to the other.
//
// Every fault is found in one pass and told as file, line, what is wrong and
// what would be right. The table in specs.go is the single list of keys,
// defaults and their meaning: the reader refuses a key that is not in it and
// fills in the defaults that stand there.
package surveyfile
