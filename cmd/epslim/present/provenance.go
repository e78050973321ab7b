package present

import "strings"

// Provenance says where an output comes from and how to make it again. It
// names no user, host, folder or time of day.
type Provenance struct {
	Version string
	SHA256  string   // of the model text
	Command string   // repeats the output
	Options []Option // effective, after defaults
	Model   string   // the model text, for outputs that carry it
}

// Option is an effective option.
type Option struct{ Name, Value string }

// lines are the provenance as short lines of text.
func (p Provenance) lines() []string {
	out := []string{"epslim " + p.Version}
	if p.SHA256 != "" {
		out = append(out, "model SHA-256 "+p.SHA256)
	}
	for _, o := range p.Options {
		out = append(out, o.Name+" "+o.Value)
	}
	if p.Command != "" {
		out = append(out, "repeat with: "+p.Command)
	}
	return out
}

// OneLine is the provenance for the first line of a table of numbers.
func (p Provenance) OneLine() string { return strings.Join(p.lines(), "; ") }
