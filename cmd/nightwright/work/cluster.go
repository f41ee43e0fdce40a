package work

import (
	"bytes"
	"context"
	"fmt"
	"os"
	"os/exec"
	"path/filepath"
	"strings"

	"github.com/google/renameio/v2"
)

// ClusterJob is a run of shards as an array job of Slurm, and the gathering
// that waits for it.
type ClusterJob struct {
	Program string   // the program's own path
	Command []string // the command with its flags, without --shard, --out and --workers
	Shards  int
	Out     string // folder of the parts
	Options string // more options of sbatch
}

// Script is a shell script that submits both jobs and prints their numbers.
// Jobs start in the folder it is run from. A shard that failed can be run
// again by running the script again: whole parts are left as they are.
func (j *ClusterJob) Script() string {
	var b strings.Builder
	line := func(format string, args ...any) { fmt.Fprintf(&b, format+"\n", args...) }
	line("#!/bin/sh")
	line("# Runs a simulation as %d jobs of Slurm, then joins their parts.", j.Shards)
	line("# Run it where sbatch is, from this folder. Run again, it does only what is missing.")
	line("set -eu")
	line("mkdir -p %s", shellWord(j.Out))
	options := "--job-name=nightwright --cpus-per-task=1"
	if j.Options != "" {
		options += " " + j.Options
	}
	line("array=$(sbatch --parsable %s --array=1-%d --output=%s <<'SHARD'", options, j.Shards, shellWord(filepath.Join(j.Out, "shard-%a.log")))
	line("#!/bin/sh")
	line("set -eu")
	words := []string{shellWord(j.Program)}
	for _, w := range j.Command {
		words = append(words, shellWord(w))
	}
	line(`exec %s --shard "$SLURM_ARRAY_TASK_ID/%d" --out %s --workers "${SLURM_CPUS_PER_TASK:-1}" --quiet`, strings.Join(words, " "), j.Shards, shellWord(j.Out))
	line("SHARD")
	line(")")
	line("array=${array%%%%;*}")
	line(`gather=$(sbatch --parsable %s --dependency=afterok:"$array" --output=%s <<'GATHER'`, options, shellWord(filepath.Join(j.Out, "gather.log")))
	line("#!/bin/sh")
	line("exec %s gather %s --quiet", shellWord(j.Program), shellWord(j.Out))
	line("GATHER")
	line(")")
	line(`echo "$array ${gather%%%%;*}"`)
	return b.String()
}

// shellWord makes a word safe in a shell script.
func shellWord(w string) string {
	const plain = "abcdefghijklmnopqrstuvwxyzABCDEFGHIJKLMNOPQRSTUVWXYZ0123456789-_./:+=@%,"
	if w != "" && strings.Trim(w, plain) == "" {
		return w
	}
	return "'" + strings.ReplaceAll(w, "'", `'\''`) + "'"
}

// Submit writes the script beside the parts and runs it. It returns the
// numbers of the array job and of the gathering.
func (j *ClusterJob) Submit(ctx context.Context) (array, gather, path string, err error) {
	if _, err := exec.LookPath("sbatch"); err != nil {
		return "", "", "", Inputf("there is no sbatch here; run this where Slurm is, or take --submit script and run what it prints there")
	}
	if err := os.MkdirAll(j.Out, 0o755); err != nil {
		return "", "", "", Inputf("the parts can't go to %s: %v", j.Out, err)
	}
	path = filepath.Join(j.Out, "submit.sh")
	if err := renameio.WriteFile(path, []byte(j.Script()), 0o755); err != nil {
		return "", "", "", err
	}
	var out, msg bytes.Buffer
	cmd := exec.CommandContext(ctx, "/bin/sh", path)
	cmd.Stdout, cmd.Stderr = &out, &msg
	if err := cmd.Run(); err != nil {
		return "", "", path, fmt.Errorf("sbatch: %w: %s", err, strings.TrimSpace(msg.String()))
	}
	if n, err := fmt.Sscan(out.String(), &array, &gather); n != 2 {
		return "", "", path, fmt.Errorf("sbatch wrote %q (%v); want two job numbers", out.String(), err)
	}
	return array, gather, path, nil
}
