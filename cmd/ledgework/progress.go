package main

import (
	"fmt"
	"strings"
	"time"

	"github.com/vbauerster/mpb/v8"
	"github.com/vbauerster/mpb/v8/decor"

	"ledgework/cmd/internal/worksite"
)

// newProgress draws bars where there is a screen and nobody asked for quiet,
// and is silent elsewhere.
// The function it returns must be called before anything else is printed.
func newProgress(g *globals, term *terminal) (worksite.Progress, func()) {
	if !term.interactive || g.Quiet || g.JSON {
		return nil, func() {}
	}
	b := &bars{p: mpb.New(mpb.WithOutput(term.err), mpb.WithAutoRefresh(), mpb.WithWidth(barWidth), mpb.WithRefreshRate(120*time.Millisecond))}
	return b, b.close
}

// Widths in characters: of a bar, and of what stands right of one.
const (
	barWidth    = 32
	spinnerTail = 31
)

// bars shows one bar for each stage, with rate and remaining time.
type bars struct {
	p   *mpb.Progress
	bar *mpb.Bar
}

// Begin starts the bar of a stage.
func (b *bars) Begin(stage string, total int64, unit worksite.Unit) {
	name := decor.Name(stage, decor.WC{W: 18, C: decor.DindentRight})
	eta := decor.OnComplete(decor.AverageETA(decor.ET_STYLE_GO, decor.WC{W: 7}), "done")
	if total <= 0 {
		b.bar = b.p.New(0, mpb.SpinnerStyle().PositionLeft(), mpb.BarFillerClearOnComplete(), mpb.PrependDecorators(name), mpb.AppendDecorators(decor.OnComplete(decor.Elapsed(decor.ET_STYLE_GO, decor.WC{W: spinnerTail}), fmt.Sprintf("%*s", barWidth+spinnerTail, "done"))))
		return
	}
	rate := decor.AverageSpeed(0, "%.0f "+string(unit)+"/s", decor.WC{W: 18})
	if unit == worksite.Bytes {
		rate = decor.AverageSpeed(decor.SizeB1000(0), "% .1f", decor.WC{W: 18})
	}
	b.bar = b.p.New(total, mpb.BarStyle(), mpb.PrependDecorators(name), mpb.AppendDecorators(decor.Percentage(decor.WC{W: 5}), rate, eta))
}

// Set moves the bar.
func (b *bars) Set(done int64) {
	if b.bar != nil {
		b.bar.SetCurrent(done)
	}
}

// End completes the bar.
func (b *bars) End() {
	if b.bar != nil {
		b.bar.SetTotal(-1, true)
		b.bar = nil
	}
}

// close draws the last state and leaves the cursor below it.
func (b *bars) close() {
	if b.bar != nil {
		b.bar.Abort(false)
	}
	b.p.Wait()
}

// printStages writes how long each stage took.
func printStages(term *terminal, stages []worksite.Stage) {
	var all time.Duration
	for _, s := range stages {
		all += s.Elapsed
		line := fmt.Sprintf("%-18s %8.2f s   %s", s.Name, s.Elapsed.Seconds(), s.Note)
		fmt.Fprintln(term.err, strings.TrimRight(line, " "))
	}
	fmt.Fprintf(term.err, "%-18s %8.2f s\n", "total", all.Seconds())
}
