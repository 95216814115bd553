package main

import (
	"fmt"
	"sync"
	"time"
)

// progress shows how far long work has come, on a terminal's stderr only, and
// only when it lasts.
type progress struct {
	env     environment
	what    string // format of done and total
	started time.Time
	mu      sync.Mutex
	shown   bool
}

// worthShowing is how long work lasts before it is shown.
const worthShowing = 500 * time.Millisecond

func newProgress(env environment) *progress {
	return &progress{env: env, what: "core size %d of at most %d ", started: time.Now()}
}

func (p *progress) report(done, total int) {
	if !p.env.progress || time.Since(p.started) < worthShowing {
		return
	}
	p.mu.Lock()
	defer p.mu.Unlock()
	p.shown = true
	fmt.Fprintf(p.env.stderr, "\r"+p.what, done, total)
}

// done clears the line.
func (p *progress) done() {
	p.mu.Lock()
	defer p.mu.Unlock()
	if p.shown {
		fmt.Fprintf(p.env.stderr, "\r%40s\r", "")
	}
}
