package main

import (
	"fmt"
	"io"
	"strings"
	"time"
	"unicode/utf8"
)

// progress is one line on standard error that is rewritten while long work
// goes on; it is silent unless standard error is a terminal.
type progress struct {
	w    io.Writer
	on   bool
	last time.Time
	used int
}

func (a *app) progress() *progress {
	return &progress{w: a.err, on: !a.quiet && isTerminal(a.err), last: time.Now()}
}

// show replaces the line, at most ten times a second; the first half second
// is silent.
func (p *progress) show(format string, args ...any) {
	if !p.on || time.Since(p.last) < 100*time.Millisecond && p.used > 0 || p.used == 0 && time.Since(p.last) < 500*time.Millisecond {
		return
	}
	p.last = time.Now()
	s := fmt.Sprintf(format, args...)
	n := utf8.RuneCountInString(s)
	fmt.Fprintf(p.w, "\r%s%s", s, strings.Repeat(" ", max(p.used-n, 0)))
	p.used = n
}

// clear removes the line.
func (p *progress) clear() {
	if p.used > 0 {
		fmt.Fprintf(p.w, "\r%s\r", strings.Repeat(" ", p.used))
		p.used = 0
	}
}

// remark prints a warning on standard error unless --quiet is set.
func (a *app) remark(format string, args ...any) {
	if !a.quiet {
		fmt.Fprintf(a.err, "epslim: "+format+"\n", args...)
	}
}
