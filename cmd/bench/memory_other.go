//go:build !linux

package main

import (
	"fmt"
	"runtime"
)

func resetPeak() { runtime.GC() }

// peak is what the program took from the system so far, MB.
func peak() string {
	var m runtime.MemStats
	runtime.ReadMemStats(&m)
	return fmt.Sprint(m.Sys >> 20)
}

// userSeconds isn't known here.
func userSeconds() float64 { return 0 }
