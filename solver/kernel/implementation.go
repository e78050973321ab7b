package kernel

//go:generate sh -c "cd generate && go run . -out ../vector_amd64.s -stubs ../vector_amd64.go -pkg kernel"

// Implementation is one set of vector kernels. All give the same bits.
type Implementation struct{ ops *vectorOps }

// Name is "avx512", "avx2" or "portable".
func (i Implementation) Name() string { return i.ops.name }

// Implementations returns those this processor can run, the fastest first; the
// last one is always "portable".
func Implementations() []Implementation {
	var list []Implementation
	for _, ops := range accelerated() {
		list = append(list, Implementation{ops})
	}
	return append(list, Implementation{portable()})
}

func fastest() *vectorOps { return Implementations()[0].ops }

// NewScratchFor is NewScratch with a chosen implementation, for comparison.
func (p *Program) NewScratchFor(i Implementation) *Scratch { return p.newScratch(i.ops) }

// NewRandomFor is NewRandom with a chosen implementation, for comparison.
func NewRandomFor(i Implementation) Random { return Random{i.ops} }
