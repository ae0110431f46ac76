package toys

import (
	"context"
	"runtime"
	"sync"
	"sync/atomic"

	"lumireach/stats"
)

// fitter is what the loop over toys needs of *stats.Fitter.
type fitter interface {
	Free(d *stats.Data, near, maxMu float64) stats.Fit
	Q0(d *stats.Data, near float64) (float64, stats.Status)
	QTilde(d *stats.Data, mu float64, free stats.Fit) (float64, stats.Status)
}

// runner shares blocks of toys among workers.
type runner struct {
	ctx       context.Context
	config    Config
	newFitter func(*stats.Engine) fitter

	mutex    sync.Mutex
	progress Progress

	checks [2]Check // of the weights, by significance
}

func newRunner(ctx context.Context, c Config) *runner {
	return &runner{ctx: ctx, config: c, newFitter: func(e *stats.Engine) fitter { return e.Fitter() }}
}

// worker owns what a block of toys needs.
type worker struct {
	fit    fitter
	data   stats.Data
	stream *stream
	logs   []float64
	drawn  *drawnToy // nil where parameters are fixed
}

func newWorker(e *stats.Engine, f fitter, proposals int, ensemble Nuisances) *worker {
	w := &worker{
		fit:    f,
		data:   stats.Data{N: make([]float64, e.Bins()), A: make([]float64, e.Auxiliary()), M: make([]float64, e.Factors())},
		stream: newStream(),
		logs:   make([]float64, proposals),
	}
	if ensemble == Drawn {
		w.drawn = newDrawnToy(e)
	}
	return w
}

const (
	fewestBlocks = 40  // what a bootstrap over blocks needs
	blockToys    = 512 // most toys of one point in a block
)

// run calls work once for each block, on as many workers as there are. Work
// writes to its block's own place, so that the result is the same whoever does
// it and whenever.
func (r *runner) run(e *stats.Engine, proposals, blocks int, work func(w *worker, block int)) error {
	return r.share(blocks, func() func(int) {
		w := newWorker(e, r.newFitter(e), proposals, r.config.Nuisances)
		return func(block int) { work(w, block) }
	})
}

// share has tasks 0 … n-1 done by the workers, each of which begins by making
// what it needs. It stops early only with the context.
func (r *runner) share(n int, begin func() func(task int)) error {
	workers := r.config.Workers
	if workers == 0 {
		workers = runtime.GOMAXPROCS(0)
	}
	var next atomic.Int64
	var group sync.WaitGroup
	for range min(workers, n) {
		group.Go(func() {
			do := begin()
			for r.ctx.Err() == nil {
				task := int(next.Add(1)) - 1
				if task >= n {
					return
				}
				do(task)
			}
		})
	}
	group.Wait()
	return r.ctx.Err()
}

// stage names what is under way.
func (r *runner) stage(name string) {
	r.mutex.Lock()
	defer r.mutex.Unlock()
	r.progress.Stage = name
	if r.config.Progress != nil {
		r.config.Progress(r.progress)
	}
}

// done tells that so many toys more are ready.
func (r *runner) done(toys int) {
	r.mutex.Lock()
	defer r.mutex.Unlock()
	r.progress.Done += int64(toys)
	if r.config.Progress != nil {
		r.config.Progress(r.progress)
	}
}
