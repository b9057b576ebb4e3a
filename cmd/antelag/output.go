package main

import (
	"encoding/json"
	"io"
	"os"

	"golang.org/x/term"
)

// writeJSON writes the one JSON object of a command.
func writeJSON(out io.Writer, v any) error {
	e := json.NewEncoder(out)
	e.SetIndent("", " ")
	return e.Encode(v)
}

// inColour reports whether stdout takes colours and nobody said no
// (https://no-color.org).
func inColour() bool {
	return term.IsTerminal(int(os.Stdout.Fd())) && os.Getenv("NO_COLOR") == "" && os.Getenv("TERM") != "dumb"
}
