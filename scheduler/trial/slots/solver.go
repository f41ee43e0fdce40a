package slots

import (
	"bufio"
	"context"
	"errors"
	"fmt"
	"os"
	"os/exec"
	"path/filepath"
	"strconv"
	"strings"
)

// Solution is a proven optimum.
type Solution struct {
	Value float64   // C
	Taken []float64 // by column; nil where the solver's file wasn't asked for it
}

// ErrNotProven says that a solver ended without a proven optimum.
var ErrNotProven = errors.New("slots: no proven optimum")

// Solvers names the programs that Solve can run; each is the name of a Debian
// package's command (glpk-utils, coinor-cbc).
func Solvers() []string { return []string{"glpsol", "cbc"} }

// Solve has a general solver find the optimum. seconds limits it: a search cut
// short is an error that is ErrNotProven. relaxed leaves the columns fractional.
func (pr *Program) Solve(ctx context.Context, solver string, seconds int, relaxed bool) (*Solution, error) {
	dir, err := os.MkdirTemp("", "slots")
	if err != nil {
		return nil, err
	}
	defer os.RemoveAll(dir)
	lp, out := filepath.Join(dir, "survey.lp"), filepath.Join(dir, "survey.sol")
	f, err := os.Create(lp)
	if err != nil {
		return nil, err
	}
	if err := errors.Join(pr.Write(f, relaxed), f.Close()); err != nil {
		return nil, err
	}
	limit := strconv.Itoa(seconds)
	var cmd *exec.Cmd
	switch solver {
	case "glpsol":
		args := []string{"--lp", lp, "-w", out, "--tmlim", limit}
		if !relaxed {
			args = append(args, "--cuts")
		}
		cmd = exec.CommandContext(ctx, "glpsol", args...)
	case "cbc":
		cmd = exec.CommandContext(ctx, "cbc", lp, "-timeMode", "elapsed", "-ratioGap", "0", "-allowableGap", "0", "-sec", limit, "solve", "solution", out)
	default:
		return nil, fmt.Errorf("slots: solver %q is not known; want one of %v", solver, Solvers())
	}
	text, err := cmd.CombinedOutput()
	if err != nil {
		return nil, fmt.Errorf("slots: %s: %w: %s", solver, err, tail(string(text)))
	}
	file, err := os.ReadFile(out)
	if err != nil {
		return nil, fmt.Errorf("slots: %s wrote no solution: %s", solver, tail(string(text)))
	}
	if solver == "cbc" {
		return pr.readCBC(string(file))
	}
	return pr.readGLPK(string(file))
}

// tail is the end of a solver's output.
func tail(s string) string { return s[max(0, len(s)-400):] }

// readGLPK reads glpsol's plain solution file (GLPK's manual, glp_write_mip
// and glp_write_sol): "s mip rows cols o value", "j column value" for each.
func (pr *Program) readGLPK(text string) (*Solution, error) {
	s := &Solution{Taken: make([]float64, pr.Width())}
	proven := false
	lines := bufio.NewScanner(strings.NewReader(text))
	for lines.Scan() {
		f := strings.Fields(lines.Text())
		switch {
		case len(f) >= 6 && f[0] == "s" && f[1] == "mip":
			proven = f[4] == "o"
		case len(f) >= 7 && f[0] == "s" && f[1] == "bas":
			proven = f[4] == "f" && f[5] == "f"
		case len(f) >= 3 && f[0] == "j":
			i, err := strconv.Atoi(f[1])
			if err != nil || i < 1 || i > pr.Width() {
				return nil, fmt.Errorf("slots: glpsol names column %q of %d", f[1], pr.Width())
			}
			at := 2
			if len(f) > 3 { // of a linear programme: status before the value
				at = 3
			}
			if s.Taken[i-1], err = strconv.ParseFloat(f[at], 64); err != nil {
				return nil, err
			}
		}
	}
	if !proven {
		return nil, fmt.Errorf("glpsol: %w", ErrNotProven)
	}
	pr.recount(s)
	return s, nil
}

// readCBC reads cbc's solution file: a line with the status, then number,
// name, value and reduced cost of each column that isn't 0.
func (pr *Program) readCBC(text string) (*Solution, error) {
	first, rest, _ := strings.Cut(text, "\n")
	if !strings.HasPrefix(first, "Optimal") {
		return nil, fmt.Errorf("cbc: %w: %s", ErrNotProven, first)
	}
	s := &Solution{Taken: make([]float64, pr.Width())}
	lines := bufio.NewScanner(strings.NewReader(rest))
	for lines.Scan() {
		f := strings.Fields(lines.Text())
		if len(f) > 0 && f[0] == "**" { // marks a value beyond its bounds by the tolerance
			f = f[1:]
		}
		if len(f) < 3 || !strings.HasPrefix(f[1], "x") {
			continue
		}
		i, err := strconv.Atoi(f[1][1:])
		if err != nil || i < 1 || i > pr.Width() {
			return nil, fmt.Errorf("slots: cbc names column %q of %d", f[1], pr.Width())
		}
		if s.Taken[i-1], err = strconv.ParseFloat(f[2], 64); err != nil {
			return nil, err
		}
	}
	pr.recount(s)
	return s, nil
}

// recount sums the values of what is taken: the solvers print few digits.
func (pr *Program) recount(s *Solution) {
	for i, x := range s.Taken {
		s.Value += x * pr.worth(i)
	}
}
