package main

import (
	"fmt"
	"os"
	"runtime/debug"
	"strings"
	"syscall"
)

// resetPeak makes the kernel count the peak of memory afresh (proc(5),
// clear_refs), after what the last survey left was given back.
func resetPeak() {
	debug.FreeOSMemory()
	// Where it can't be written the peak is that of all surveys so far.
	_ = os.WriteFile("/proc/self/clear_refs", []byte("5"), 0o200)
}

// peak is the most memory the process had resident since resetPeak, MB.
func peak() string {
	text, err := os.ReadFile("/proc/self/status")
	if err != nil {
		return "-"
	}
	for _, line := range strings.Split(string(text), "\n") {
		var kb int64
		if n, _ := fmt.Sscanf(line, "VmHWM: %d kB", &kb); n == 1 {
			return fmt.Sprint(kb >> 10)
		}
	}
	return "-"
}

// userSeconds is the CPU time the process has used, s.
func userSeconds() float64 {
	var u syscall.Rusage
	if err := syscall.Getrusage(syscall.RUSAGE_SELF, &u); err != nil {
		return 0
	}
	return float64(u.Utime.Sec) + float64(u.Utime.Usec)*1e-6
}
