package main

import (
	"fmt"
	"os"
	"slices"

	"github.com/spf13/cobra"
	"github.com/spf13/pflag"

	"nightwright/cmd/nightwright/work"
)

// own are the flags that a shard of a cluster job gets its own values of, or
// that are of this call alone.
var own = []string{"submit", "shards", "sbatch", "shard", "out", "workers", "quiet", "json", "csv", "help", "version"}

// submit turns a command into an array job: printed, or handed to Slurm.
func (a *app) submit(cmd *cobra.Command, args []string, f *seasonsFlags) error {
	switch {
	case f.submit != "slurm" && f.submit != "script":
		return work.Inputf("--submit is %q; want slurm, or script to print the script", f.submit)
	case f.ask.Shard != "":
		return work.Inputf("--submit and --shard were both given; want one of them")
	case f.ask.Out == "":
		return work.Inputf("--submit wants --out with the folder for the parts, on a disk that all nodes see")
	case f.ask.Seasons < 1:
		return work.Inputf("--seasons is %d; want 1 or more", f.ask.Seasons)
	case f.shards < 1 || f.shards > f.ask.Seasons:
		return work.Inputf("--shards is %d; want 1 to %d, the number of seasons", f.shards, f.ask.Seasons)
	}
	// A fault is better told now than by sixteen jobs.
	if _, err := a.survey(args[0]); err != nil {
		return err
	}
	if len(args) > 1 {
		if _, err := work.ReadPlan(args[1]); err != nil {
			return err
		}
	}
	program, err := os.Executable()
	if err != nil {
		return err
	}
	job := work.ClusterJob{Program: program, Command: append([]string{cmd.Name()}, args...), Shards: f.shards, Out: f.ask.Out, Options: f.sbatch}
	cmd.Flags().VisitAll(func(g *pflag.Flag) {
		// Also what comes from the environment or a settings file: the nodes may
		// have neither.
		if g.Changed && !slices.Contains(own, g.Name) {
			job.Command = append(job.Command, "--"+g.Name+"="+g.Value.String())
		}
	})
	if f.submit == "script" {
		fmt.Fprint(a.stdout, job.Script())
		return nil
	}
	array, gather, path, err := job.Submit(cmd.Context())
	if err != nil {
		return err
	}
	a.endProgress()
	if a.asJSON {
		return a.json(map[string]string{"array_job": array, "gather_job": gather, "script": path, "folder": f.ask.Out})
	}
	fmt.Fprintf(a.stdout, "submitted: array job %s of %s, then job %s, which joins them in %s\n", array, count(f.shards, "shard"), gather, f.ask.Out)
	return nil
}
