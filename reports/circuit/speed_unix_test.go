//go:build unix

package circuit

import (
	"strings"
	"syscall"
	"testing"
	"time"

	"gapwright/tank"
)

// processTime returns the processor time of this process so far.
func processTime(b *testing.B) time.Duration {
	var u syscall.Rusage
	if err := syscall.Getrusage(syscall.RUSAGE_SELF, &u); err != nil {
		b.Fatal(err)
	}
	return time.Duration(u.Utime.Nano() + u.Stime.Nano())
}

// The processor time of a corner with its frequency search against that of the
// simulator for 20 periods which start at the solution.
func BenchmarkAgainstSimulator(b *testing.B) {
	for _, c := range liveCases() {
		b.Run("case="+strings.ReplaceAll(c.name, " ", "-"), func(b *testing.B) {
			tk := c.tank()
			o, err := tank.Solve(tk, c.corner)
			if err != nil || o.Status != tank.OK {
				b.Fatalf("%v %s %s", err, o.Status, o.Reason)
			}
			_, cpu := simulate(b, tk, o, 20)
			before := processTime(b)
			for b.Loop() {
				if _, err := tank.Solve(tk, c.corner); err != nil {
					b.Fatal(err)
				}
			}
			b.ReportMetric(cpu.Seconds(), "simulator-s")
			own := (processTime(b) - before).Seconds() / float64(b.N)
			b.ReportMetric(cpu.Seconds()/own, "times")
		})
	}
}
