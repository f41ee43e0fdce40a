// Package scenarios is the room of what surrounds a plan: its subpackages
// read survey files (surveyfile), write starter surveys (starter), and hold
// the scenarios a plan is tried under.
//
// Nothing here prints, exits, or reads the clock or the environment.
package scenarios
