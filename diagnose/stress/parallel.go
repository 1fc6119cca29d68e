package stress

import (
	"runtime"
	"sync"
	"sync/atomic"
)

// each does n pieces of work, as many at a time as there are processors, and gives the error of the first piece that
// failed. Every piece writes to its own place, so the result does not depend on the order.
func each(n int, work func(k int) error) error {
	failures := make([]error, n)
	var next atomic.Int64
	var group sync.WaitGroup
	for range min(n, runtime.GOMAXPROCS(0)) {
		group.Add(1)
		go func() {
			defer group.Done()
			for k := int(next.Add(1)) - 1; k < n; k = int(next.Add(1)) - 1 {
				failures[k] = work(k)
			}
		}()
	}
	group.Wait()
	for _, err := range failures {
		if err != nil {
			return err
		}
	}
	return nil
}
