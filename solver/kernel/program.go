package kernel

import (
	"fmt"
	"slices"
	"strings"
	"unsafe"
)

// Program is a compiled set of expressions: a flat list of operations on rows.
// It is immutable and safe for concurrent use.
type Program struct {
	inputs  []string
	outputs int
	rows    int // inputs + outputs + temporaries
	ops     []op
}

// BlockSize is the number of points a Program works on at a time. Longer rows
// are cut into blocks; the results do not depend on where the cuts fall.
const BlockSize = 512

// rowStride separates the rows of a Scratch. It is not a multiple of 4096
// bytes, so that equal places of different rows do not compete for one cache
// set, nor of one odd cache line, which measured slower.
const rowStride = BlockSize + 136

// unit is the number of points the assembly kernels handle at a time: four wide
// vectors.
const unit = 32

// Inputs returns the names of the inputs in the order Eval expects them.
func (p *Program) Inputs() []string { return slices.Clone(p.inputs) }

// Outputs returns the number of outputs.
func (p *Program) Outputs() int { return p.outputs }

// Len returns the number of operations.
func (p *Program) Len() int { return len(p.ops) }

// String lists the operations, one a line, for diagnosis.
func (p *Program) String() string {
	var s strings.Builder
	name := func(r int32) string {
		switch {
		case int(r) < len(p.inputs):
			return p.inputs[r]
		case int(r) < len(p.inputs)+p.outputs:
			return fmt.Sprintf("out%d", int(r)-len(p.inputs))
		}
		return fmt.Sprintf("t%d", int(r)-len(p.inputs)-p.outputs)
	}
	for _, o := range p.ops {
		fmt.Fprintf(&s, "%s", name(o.d))
		if o.code == opSinCos {
			fmt.Fprintf(&s, ", %s", name(o.d2))
		}
		fmt.Fprintf(&s, " = %s", opNames[o.code])
		if o.code == opCall1 || o.code == opCall2 {
			fmt.Fprintf(&s, " %s", o.fn)
		}
		for _, r := range [...]int32{o.a, o.b, o.e} {
			if r >= 0 {
				fmt.Fprintf(&s, " %s", name(r))
			}
		}
		switch o.code {
		case opFill, opAxpy, opMul, opFma, opDiv, opRcp, opSin, opCos, opSinCos, opExp, opCall1:
			fmt.Fprintf(&s, " c=%g", o.c)
		case opLin, opFmaK:
			fmt.Fprintf(&s, " c=%g k=%g", o.c, o.k)
		}
		s.WriteByte('\n')
	}
	return s.String()
}

// Scratch is the working memory of one Program for one goroutine.
type Scratch struct {
	program *Program
	table   *vectorOps
	rows    [][]float64 // the rows of the operations, set for each block
	own     [][]float64 // inputs, outputs, temporaries of the Scratch itself
}

// NewScratch allocates working memory for p, to be used by one goroutine at a
// time. The fastest kernels the processor has are used.
func (p *Program) NewScratch() *Scratch { return p.newScratch(fastest()) }

func (p *Program) newScratch(table *vectorOps) *Scratch {
	s := &Scratch{program: p, table: table, rows: make([][]float64, p.rows), own: make([][]float64, p.rows)}
	buf := AlignedRow(p.rows * rowStride)
	for i := range s.own {
		s.own[i] = buf[i*rowStride : i*rowStride+BlockSize : i*rowStride+BlockSize]
	}
	return s
}

// AlignedRow returns a slice of n zeros that starts at a multiple of 64 bytes,
// the width of the widest vector load.
func AlignedRow(n int) []float64 {
	buf := make([]float64, n+7)
	off := 0
	for n > 0 && uintptr(unsafe.Pointer(&buf[off]))&63 != 0 {
		off++
	}
	return buf[off : off+n : off+n]
}

// Eval evaluates the program at n points. inputs holds one row for each of
// Inputs(), of length n, or of length 1 for a value that is the same at all
// points; outputs holds one row of length at least n for each output. Output
// rows must not overlap input rows or each other. An error is returned only
// when the shapes are wrong or s belongs to another Program.
func (p *Program) Eval(s *Scratch, inputs, outputs [][]float64, n int) error {
	if s == nil || s.program != p {
		return fmt.Errorf("kernel: the scratch belongs to another program")
	}
	if len(inputs) != len(p.inputs) || len(outputs) != p.outputs || n < 0 {
		return fmt.Errorf("kernel: got %d inputs, %d outputs, %d points for a program of %d inputs (%s) and %d outputs",
			len(inputs), len(outputs), n, len(p.inputs), strings.Join(p.inputs, ", "), p.outputs)
	}
	for i, r := range inputs {
		if len(r) < n && len(r) != 1 {
			return fmt.Errorf("kernel: input %q has %d values for %d points", p.inputs[i], len(r), n)
		}
	}
	for i, r := range outputs {
		if len(r) < n {
			return fmt.Errorf("kernel: output %d has room for %d of %d points", i, len(r), n)
		}
	}
	for at := 0; at < n; at += BlockSize {
		p.evalBlock(s, inputs, outputs, at, min(BlockSize, n-at))
	}
	return nil
}

// evalBlock runs the operations on the points at..at+m, m <= BlockSize. A block
// that is not a whole number of units is run on padded copies.
func (p *Program) evalBlock(s *Scratch, inputs, outputs [][]float64, at, m int) {
	padded := (m + unit - 1) / unit * unit
	nin := len(p.inputs)
	for i, r := range inputs {
		switch {
		case len(r) == 1:
			own := s.own[i][:padded]
			for j := range own {
				own[j] = r[0]
			}
			s.rows[i] = own
		case padded == m:
			s.rows[i] = r[at : at+m]
		default:
			own := s.own[i][:padded]
			copy(own, r[at:at+m])
			for j := m; j < padded; j++ {
				own[j] = r[at+m-1]
			}
			s.rows[i] = own
		}
	}
	for i, r := range outputs {
		if padded == m {
			s.rows[nin+i] = r[at : at+m]
		} else {
			s.rows[nin+i] = s.own[nin+i][:padded]
		}
	}
	for i := nin + p.outputs; i < p.rows; i++ {
		s.rows[i] = s.own[i][:padded]
	}
	run(s.table, p.ops, s.rows)
	if padded != m {
		for i, r := range outputs {
			copy(r[at:at+m], s.own[nin+i])
		}
	}
}

// EvalPoint evaluates the program at one point: x holds the inputs, y receives
// the outputs.
func (p *Program) EvalPoint(s *Scratch, x, y []float64) error {
	if len(x) != len(p.inputs) || len(y) != p.outputs {
		return fmt.Errorf("kernel: got %d values for %d inputs and room for %d of %d outputs", len(x), len(p.inputs), len(y), p.outputs)
	}
	in, out := make([][]float64, len(x)), make([][]float64, len(y))
	for i := range x {
		in[i] = x[i : i+1]
	}
	for i := range y {
		out[i] = y[i : i+1]
	}
	return p.Eval(s, in, out, 1)
}
