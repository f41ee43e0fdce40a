package work

import (
	"fmt"
	"strings"

	"nightwright/scenarios/surveyfile"
	"nightwright/scheduler/model"
)

// Options are what every job takes.
type Options struct {
	Workers  int                  // threads; results don't depend on it
	Progress func(model.Progress) // may be nil; called from one goroutine at a time
	Version  string               // of the program, for plan.json
}

// tell reports a step of a phase.
func (o Options) tell(phase string, done, total int) {
	if o.Progress != nil {
		o.Progress(model.Progress{Phase: phase, Done: done, Total: total})
	}
}

// InputError says that the input is at fault: the faults of a survey's files
// with their places, or one sentence that says what would be right.
type InputError struct {
	Issues []surveyfile.Issue // faults and warnings, sorted by place; or
	What   string             // one fault without a place
	Of     string             // what the issues are about; "" is a survey
}

// Inputf makes an InputError of one sentence.
func Inputf(format string, args ...any) error {
	return &InputError{What: fmt.Sprintf(format, args...)}
}

// Lines returns one message a fault.
func (e *InputError) Lines() []string {
	if len(e.Issues) == 0 {
		return []string{"nightwright: " + e.What}
	}
	lines := make([]string, len(e.Issues))
	for i := range e.Issues {
		lines[i] = e.Issues[i].String()
	}
	return lines
}

// Faults counts the issues that are not warnings.
func (e *InputError) Faults() int { return surveyfile.Faults(e.Issues) }

// Error joins the messages.
func (e *InputError) Error() string { return strings.Join(e.Lines(), "\n") }
