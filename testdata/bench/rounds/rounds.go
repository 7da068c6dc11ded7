// Package rounds measures pieces of code against each other on a machine that
// does other things as well: each runs for a short while in turn, many times over,
// and medians are taken.
package rounds

import (
	"runtime"
	"slices"
	"time"
)

// Slice is how long one piece runs at a time.
const Slice = 4 * time.Millisecond

// Medians runs each function for about a slice in turn, as many rounds as are
// asked for, and returns the median time of one call of each in nanoseconds of the
// thread's processor time. The functions are given a number that counts up from 0.
func Medians(rounds int, slice time.Duration, fs ...func(i int)) []float64 {
	runtime.LockOSThread()
	defer runtime.UnlockOSThread()
	return medians(cpuTime, rounds, slice, fs)
}

// ProcessMedians is [Medians] in the processor time of all threads.
func ProcessMedians(rounds int, slice time.Duration, fs ...func(i int)) []float64 {
	return medians(processTime, rounds, slice, fs)
}

// WallMedians is [Medians] by the clock on the wall, for functions that use
// several threads.
func WallMedians(rounds int, slice time.Duration, fs ...func(i int)) []float64 {
	started := time.Now()
	return medians(func() time.Duration { return time.Since(started) }, rounds, slice, fs)
}

func medians(clock func() time.Duration, rounds int, slice time.Duration, fs []func(i int)) []float64 {
	calls := make([]int, len(fs))
	next := make([]int, len(fs))
	took := make([][]float64, len(fs))
	run := func(k, n int) time.Duration {
		start := clock()
		for range n {
			fs[k](next[k])
			next[k]++
		}
		return clock() - start
	}
	for k := range fs { // how many calls fill a slice
		calls[k] = 1
		for {
			d := run(k, calls[k])
			if d >= slice/2 || calls[k] > 1<<30 {
				break
			}
			calls[k] *= 2
		}
	}
	for range rounds {
		for k := range fs {
			d := run(k, calls[k])
			took[k] = append(took[k], float64(d.Nanoseconds())/float64(calls[k]))
		}
	}
	out := make([]float64, len(fs))
	for k := range fs {
		slices.Sort(took[k])
		out[k] = took[k][len(took[k])/2]
	}
	return out
}
