package rounds

import (
	"syscall"
	"time"
	"unsafe"
)

// The clocks of clock_gettime(2).
const (
	processClock = 2 // CLOCK_PROCESS_CPUTIME_ID
	threadClock  = 3 // CLOCK_THREAD_CPUTIME_ID
)

// cpuTime returns the processor time that this thread has used: what others do on
// the machine meanwhile does not count.
func cpuTime() time.Duration { return clockTime(threadClock) }

// processTime returns that of all threads.
func processTime() time.Duration { return clockTime(processClock) }

func clockTime(clock uintptr) time.Duration {
	var ts syscall.Timespec
	if _, _, e := syscall.Syscall(syscall.SYS_CLOCK_GETTIME, clock, uintptr(unsafe.Pointer(&ts)), 0); e != 0 {
		panic(e)
	}
	return time.Duration(ts.Nano())
}
