package main

import (
	"bytes"
	"crypto/rand"
	"fmt"
	"net"
	"os"
	"os/exec"
	"path/filepath"
	"strings"
	"testing"
	"time"
)

// slurmConf is a cluster of this machine alone, without cgroups.
const slurmConf = `ClusterName=lantern
SlurmctldHost=%[1]s(127.0.0.1)
SlurmUser=root
SlurmctldPort=%[3]d
SlurmdPort=%[4]d
AuthType=auth/munge
AuthInfo=socket=%[2]s/munge.socket
CredType=cred/munge
ProctrackType=proctrack/linuxproc
TaskPlugin=task/none
JobAcctGatherType=jobacct_gather/none
SelectType=select/cons_tres
SelectTypeParameters=CR_Core
SchedulerParameters=defer_batch,sched_interval=5
ReturnToService=2
StateSaveLocation=%[2]s/state
SlurmdSpoolDir=%[2]s/spool
SlurmctldPidFile=%[2]s/slurmctld.pid
SlurmdPidFile=%[2]s/slurmd.pid
SlurmctldLogFile=%[2]s/slurmctld.log
SlurmdLogFile=%[2]s/slurmd.log
NodeName=%[1]s NodeAddr=127.0.0.1 CPUs=2 State=UNKNOWN
PartitionName=main Nodes=%[1]s Default=YES MaxTime=60 State=UP
`

// startSlurm starts a cluster of one node with an authentication daemon of its
// own, and returns the environment that finds it. Where Slurm is not installed
// the test is skipped.
func startSlurm(t *testing.T) []string {
	t.Helper()
	absent := func(why string) {
		if os.Getenv("NIGHTWRIGHT_REQUIRE_ALL") == "1" {
			t.Fatalf("%s, and NIGHTWRIGHT_REQUIRE_ALL is 1", why)
		}
		t.Skip(why)
	}
	paths := map[string]string{}
	for _, name := range []string{"munged", "slurmctld", "slurmd", "sbatch", "squeue", "sinfo"} {
		path, err := exec.LookPath(name)
		if err != nil {
			if path, err = exec.LookPath(filepath.Join("/usr/sbin", name)); err != nil {
				absent(name + " is not installed (Debian: slurmctld, slurmd, slurm-client, munge)")
			}
		}
		paths[name] = path
	}
	if os.Getuid() != 0 {
		absent("a Slurm of one node wants root here")
	}
	// Short: a socket's path has 107 bytes at most.
	dir, err := os.MkdirTemp("", "nwslurm")
	if err != nil {
		t.Fatal(err)
	}
	t.Cleanup(func() { os.RemoveAll(dir) })
	host, err := os.Hostname()
	if err != nil {
		t.Fatal(err)
	}
	host, _, _ = strings.Cut(host, ".")
	key := make([]byte, 1024)
	rand.Read(key)
	write := func(name string, data []byte) {
		if err := os.WriteFile(filepath.Join(dir, name), data, 0o400); err != nil {
			t.Fatal(err)
		}
	}
	write("munge.key", key)
	write("slurm.conf", fmt.Appendf(nil, slurmConf, host, dir, freePort(t), freePort(t)))
	write("cgroup.conf", []byte("CgroupPlugin=cgroup/v1\n"))
	for _, d := range []string{"state", "spool"} {
		if err := os.Mkdir(filepath.Join(dir, d), 0o755); err != nil {
			t.Fatal(err)
		}
	}
	env := append(os.Environ(), "SLURM_CONF="+filepath.Join(dir, "slurm.conf"))
	start := func(name string, args ...string) {
		cmd := exec.Command(paths[name], args...)
		cmd.Env = env
		var out bytes.Buffer
		cmd.Stdout, cmd.Stderr = &out, &out
		if err := cmd.Start(); err != nil {
			t.Fatal(err)
		}
		t.Cleanup(func() {
			cmd.Process.Kill()
			cmd.Wait()
			if t.Failed() {
				t.Logf("%s wrote: %s", name, clip(out.String(), 4000))
			}
		})
	}
	at := func(name string) string { return filepath.Join(dir, name) }
	start("munged", "--foreground", "--force", "--socket="+at("munge.socket"), "--key-file="+at("munge.key"),
		"--log-file="+at("munge.log"), "--pid-file="+at("munge.pid"), "--seed-file="+at("munge.seed"))
	wait(t, "the authentication socket", func() bool { _, err := os.Stat(at("munge.socket")); return err == nil })
	start("slurmctld", "-D", "-f", at("slurm.conf"))
	start("slurmd", "-D", "-f", at("slurm.conf"))
	wait(t, "an idle node", func() bool {
		cmd := exec.Command(paths["sinfo"], "-h", "-o", "%T")
		cmd.Env = env
		out, _ := cmd.Output()
		return strings.TrimSpace(string(out)) == "idle"
	})
	return env
}

func freePort(t *testing.T) int {
	t.Helper()
	l, err := net.Listen("tcp", "127.0.0.1:0")
	if err != nil {
		t.Fatal(err)
	}
	defer l.Close()
	return l.Addr().(*net.TCPAddr).Port
}

// wait looks until something is there; it gives up after two minutes, far
// beyond what it takes.
func wait(t *testing.T, what string, there func() bool) {
	t.Helper()
	for range 1200 {
		if there() {
			return
		}
		time.Sleep(100 * time.Millisecond)
	}
	t.Fatalf("waited for %s in vain", what)
}

// TestSlurm runs a forecast as an array job on a real Slurm of one node, with
// the gathering that waits for it, and compares with one process.
func TestSlurm(t *testing.T) {
	env := startSlurm(t)
	work := t.TempDir()
	run := func(args ...string) string {
		t.Helper()
		cmd := asChild(t, args...)
		cmd.Dir = work
		cmd.Env = append(env, asProgram+"=1")
		var msg bytes.Buffer
		cmd.Stderr = &msg
		out, err := cmd.Output()
		if err != nil {
			t.Fatalf("nightwright %s: %v\n%s", strings.Join(args, " "), err, msg.String())
		}
		return string(out)
	}
	if err := os.CopyFS(filepath.Join(work, "s"), os.DirFS(filepath.Join("testdata", "small"))); err != nil {
		t.Fatal(err)
	}
	run("plan", "s", "--effort", "quick", "--quiet")
	flags := []string{"forecast", "s", "s/plan", "--seasons", "9", "--policies", "fixed,planned", "--seed", "12", "--quiet"}
	run(append(flags, "--out", "whole")...)
	told := run(append(flags, "--out", "parts", "--submit", "slurm", "--shards", "4", "--sbatch", "--time=5")...)
	if !strings.Contains(told, "of 4 shards") || !strings.Contains(told, "joins them in parts") {
		t.Errorf("it told: %s", told)
	}
	wait(t, "the gathered forecast", func() bool {
		_, err := os.Stat(filepath.Join(work, "parts", "forecast.json"))
		if err != nil {
			logs, _ := filepath.Glob(filepath.Join(work, "parts", "*.log"))
			for _, l := range logs {
				if text, _ := os.ReadFile(l); bytes.Contains(text, []byte("nightwright: ")) {
					t.Fatalf("%s: %s", filepath.Base(l), text)
				}
			}
		}
		return err == nil
	})
	for _, name := range []string{"seasons.parquet", "bands.parquet", "chances.parquet", "forecast.json"} {
		one, err1 := os.ReadFile(filepath.Join(work, "whole", name))
		four, err2 := os.ReadFile(filepath.Join(work, "parts", name))
		if err1 != nil || err2 != nil || !bytes.Equal(one, four) {
			t.Errorf("%s: four shards give other bytes than one process (%v, %v)", name, err1, err2)
		}
	}
}
