package api

import "runtime"

// newSlots lets a bounded number of goroutines of batches read rows and work on them
// at once, one fewer than there are processors, so that requests for a single place
// find one free however many batches run. A place is held for 128 rows at most; those
// that wait come in turn.
func newSlots() chan struct{} { return make(chan struct{}, max(1, runtime.GOMAXPROCS(0)-1)) }
