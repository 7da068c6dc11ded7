package rounds

import (
	"syscall"
	"time"
	"unsafe"
)

// cpuTime returns the processor time that this thread has used: what others do on
// the machine meanwhile does not count.
func cpuTime() time.Duration {
	const threadClock = 3 // CLOCK_THREAD_CPUTIME_ID
	var ts syscall.Timespec
	if _, _, e := syscall.Syscall(syscall.SYS_CLOCK_GETTIME, threadClock, uintptr(unsafe.Pointer(&ts)), 0); e != 0 {
		panic(e)
	}
	return time.Duration(ts.Nano())
}
