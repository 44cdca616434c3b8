package lsq

import (
	"sync"
	"sync/atomic"
)

// parallelElements is the size of X below which workers cost more than they
// bring.
const parallelElements = 100_000

// A blockStep does the work of one block; worker selects its scratch.
type blockStep func(f *Factor, worker, block int)

// workersFor returns the number of goroutines used for a problem.
func workersFor(p *Problem) int {
	if p.N*p.P < parallelElements {
		return 1
	}
	return max(1, p.Workers)
}

// each runs a step for count blocks. Blocks write to places of their own;
// whatever is summed over blocks is summed afterwards, in their order, so
// that the number of workers does not show in results.
func (f *Factor) each(count int, step blockStep) {
	if f.workers <= 1 || count <= 1 {
		for b := range count {
			step(f, 0, b)
		}
		return
	}
	f.share(count, step)
}

func (f *Factor) share(count int, step blockStep) {
	var next atomic.Int64
	var all sync.WaitGroup
	for worker := range min(f.workers, count) {
		all.Go(func() {
			for {
				b := int(next.Add(1)) - 1
				if b >= count {
					return
				}
				step(f, worker, b)
			}
		})
	}
	all.Wait()
}
