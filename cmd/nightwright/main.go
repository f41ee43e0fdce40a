// Command nightwright plans a sky survey that observes from several sites:
// when its fields can be seen, which telescope takes which field at which
// time, how much any plan could reach at most, and the list for each night.
//
// This package is the terminal's side of the program: commands, settings,
// progress and exit codes. It holds no mathematics; the jobs themselves stand
// in the package work.
package main

import (
	"os"

	_ "time/tzdata" // local times on the sheets, on machines without a zone database
)

func main() { os.Exit(Run(os.Args[1:], os.Stdin, os.Stdout, os.Stderr)) }
