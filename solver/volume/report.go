package volume

import (
	"fmt"
	"strings"
)

// Report tells what the assembly met.
type Report struct {
	Diagonal    bool      // A has no off-diagonal entries: links along the axes only
	Monotone    bool      // no negative link coefficient: M is an M-matrix, densities are positive by construction
	NegativeAt  string    // the worst negative link, when Monotone is false
	Negative    int       // number of negative links
	MaxPeclet   float64   // largest |z| over all links, z = 2 f h / A along the link
	PecletAt    string    // where
	NoNoise     [3]int    // for each axis the number of links along it without any diffusion (pure upwind)
	NoNoiseAt   [3]string // one such place
	ZeroLinks   int       // links that carry nothing in at least one sense
	TotalLinks  int       // all links
	Evaluations int       // points at which the coefficients were evaluated
	axes        []string  // names for String
}

// String writes the findings that a reader must know, one a line; it is empty
// when there is nothing to say.
func (r Report) String() string {
	var b strings.Builder
	if !r.Monotone {
		fmt.Fprintf(&b, "%d of %d links have negative coefficients, the worst at %s: the matrix is not an M-matrix and the density may turn negative; "+
			"cells whose sides are in the ratio of the square roots of the diagonal entries of A avoid this in two dimensions\n", r.Negative, r.TotalLinks, r.NegativeAt)
	}
	for d, n := range r.NoNoise {
		if n > 0 {
			fmt.Fprintf(&b, "no noise along %s on %d links, first at %s: the upwind flux there adds a numerical diffusion |f| h\n", r.axes[d], n, r.NoNoiseAt[d])
		}
	}
	return b.String()
}

// merge adds the findings of another piece of the grid; pieces are merged in
// the order of their rows.
func (r *Report) merge(o *Report) {
	if o.Negative > 0 && r.Negative == 0 {
		r.NegativeAt = o.NegativeAt
	}
	r.Negative += o.Negative
	if o.MaxPeclet > r.MaxPeclet {
		r.MaxPeclet, r.PecletAt = o.MaxPeclet, o.PecletAt
	}
	for d := range r.NoNoise {
		if r.NoNoise[d] == 0 {
			r.NoNoiseAt[d] = o.NoNoiseAt[d]
		}
		r.NoNoise[d] += o.NoNoise[d]
	}
	r.ZeroLinks += o.ZeroLinks
	r.TotalLinks += o.TotalLinks
	r.Evaluations += o.Evaluations
}
