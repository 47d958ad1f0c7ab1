package wire

import (
	"runtime"
	"syscall"
	"time"

	"nullmark/extract/result"
)

// clock measures what a run costs.
type clock struct {
	start time.Time
	cpu   float64
}

func startClock() clock { return clock{start: time.Now(), cpu: cpuSeconds()} }

func (c clock) stop(workers int) result.Provenance {
	return result.Provenance{
		Go: runtime.Version(), Host: runtime.GOOS + "/" + runtime.GOARCH,
		Start:   c.start.UTC().Format(time.RFC3339),
		Seconds: time.Since(c.start).Seconds(), CoreSeconds: cpuSeconds() - c.cpu,
		PeakMemoryBytes: peakMemory(), Workers: workers,
	}
}

// cpuSeconds is the processor time this process has used, user and system.
func cpuSeconds() float64 {
	var u syscall.Rusage
	if syscall.Getrusage(syscall.RUSAGE_SELF, &u) != nil {
		return 0
	}
	s := func(t syscall.Timeval) float64 { return float64(t.Sec) + float64(t.Usec)*1e-6 }
	return s(u.Utime) + s(u.Stime)
}

// peakMemory is the largest resident set so far, bytes (Linux counts in KiB).
func peakMemory() uint64 {
	var u syscall.Rusage
	if syscall.Getrusage(syscall.RUSAGE_SELF, &u) != nil {
		return 0
	}
	return uint64(u.Maxrss) * 1024
}
