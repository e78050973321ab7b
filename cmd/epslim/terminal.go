package main

import (
	"io"
	"os"

	"golang.org/x/term"
)

// isTerminal tells whether a stream is a terminal.
func isTerminal(w io.Writer) bool {
	f, ok := w.(*os.File)
	return ok && term.IsTerminal(int(f.Fd()))
}

// colour tells whether a stream takes colours: a terminal, unless NO_COLOR
// is set to anything (no-color.org) or the terminal is dumb.
func colour(w io.Writer) bool {
	return os.Getenv("NO_COLOR") == "" && os.Getenv("TERM") != "dumb" && isTerminal(w)
}
