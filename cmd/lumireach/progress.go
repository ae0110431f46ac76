package main

import (
	"sync/atomic"

	"github.com/urfave/cli/v2"
	"github.com/vbauerster/mpb/v8"
	"github.com/vbauerster/mpb/v8/decor"

	"lumireach/toys"
)

// progress shows how far a run is, on a terminal and not with --quiet.
type progress struct {
	bars  *mpb.Progress
	bar   *mpb.Bar
	stage atomic.Value // string
}

func newProgress(c *cli.Context) *progress {
	if c.Bool("quiet") {
		return &progress{}
	}
	// The library writes nothing where there is no terminal.
	return &progress{bars: mpb.New(mpb.WithOutput(c.App.ErrWriter), mpb.WithWidth(40))}
}

func (p *progress) update(now toys.Progress) {
	if p.bars == nil || now.Total == 0 {
		return
	}
	p.stage.Store(now.Stage)
	if p.bar == nil {
		p.bar = p.bars.AddBar(now.Total,
			mpb.BarRemoveOnComplete(),
			mpb.PrependDecorators(decor.Any(func(decor.Statistics) string { return p.stage.Load().(string) + " " })),
			mpb.AppendDecorators(decor.Percentage(), decor.Name(" "), decor.AverageETA(decor.ET_STYLE_GO)))
	}
	p.bar.SetTotal(now.Total, false)
	p.bar.SetCurrent(now.Done)
}

func (p *progress) end() {
	if p.bar != nil {
		p.bar.Abort(true)
		p.bars.Wait()
	}
}
