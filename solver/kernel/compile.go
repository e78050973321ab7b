package kernel

import (
	"errors"
	"fmt"
	"slices"
)

// opcode is an operation of a Program on rows. c stands for the operation's
// first immediate, k for its second.
type opcode uint8

const (
	opFill   opcode = iota // d = c
	opCopy                 // d = a
	opLin                  // d = c*a + k
	opAxpy                 // d = c*a + b
	opMul                  // d = (c*a)*b
	opFma                  // d = (c*a)*b + e
	opFmaK                 // d = (c*a)*b + k
	opDiv                  // d = (c*a)/b
	opRcp                  // d = c/a
	opSqrt                 // d = sqrt(a)
	opAbs                  // d = |a|
	opFloor                // d = floor(a)
	opMin                  // d = min(a, b)
	opMax                  // d = max(a, b)
	opSin                  // d = sin(c*a)
	opCos                  // d = cos(c*a)
	opSinCos               // d = sin(c*a), d2 = cos(c*a)
	opExp                  // d = exp(c*a)
	opLog                  // d = log(a)
	opCall1                // d = fn(a), with the parameter c
	opCall2                // d = fn(a, b)
)

var opNames = [...]string{"fill", "copy", "lin", "axpy", "mul", "fma", "fmak", "div", "rcp", "sqrt",
	"abs", "floor", "min", "max", "sin", "cos", "sincos", "exp", "log", "call1", "call2"}

// none marks an unused operand.
const none = -1

type op struct {
	code           opcode
	fn             function
	d, d2, a, b, e int32 // first values, after allocation rows
	c, k           float64
}

// lowering is the state of one Compile.
type lowering struct {
	b      *Builder
	uses   []int
	paired map[Node]bool // arguments of which both sine and cosine are needed
	value  map[Node]int32
	ops    []op
	values int32
}

// Compile lowers the outputs to a Program. It fails when the Builder was
// misused or an output is not one of its nodes.
func (b *Builder) Compile(outputs ...Node) (*Program, error) {
	if b.err != nil {
		return nil, b.err
	}
	if len(outputs) == 0 {
		return nil, errors.New("kernel: a program needs at least one output")
	}
	for i, x := range outputs {
		if !b.ok(x) {
			return nil, fmt.Errorf("kernel: output %d is not a node of this builder", i)
		}
	}
	l := &lowering{b: b, uses: make([]int, len(b.nodes)), paired: map[Node]bool{}, value: map[Node]int32{}}
	l.count(outputs)
	l.values = int32(len(b.inputs))
	for i, name := range b.inputs {
		l.value[b.Input(name)] = int32(i)
	}
	results := make([]int32, len(outputs))
	for i, x := range outputs {
		results[i] = l.emit(x)
	}
	return l.allocate(results), nil
}

// count fills in how often each node is used and which sines have a cosine.
func (l *lowering) count(outputs []Node) {
	nodes := l.b.nodes
	seen := make([]bool, len(nodes))
	trig := map[Node]kind{}
	var visit func(Node)
	visit = func(x Node) {
		l.uses[x]++
		if seen[x] {
			return
		}
		seen[x] = true
		n := &nodes[x]
		if n.kind == kindSin || n.kind == kindCos {
			if k, ok := trig[n.a]; ok && k != n.kind {
				l.paired[n.a] = true
			}
			trig[n.a] = n.kind
		}
		if k := n.operands(); k > 0 {
			visit(n.a)
			if k > 1 {
				visit(n.b)
			}
		}
	}
	for _, x := range outputs {
		visit(x)
	}
}

func (l *lowering) push(x Node, o op) int32 {
	o.d = l.values
	l.values++
	l.ops = append(l.ops, o)
	l.value[x] = o.d
	return o.d
}

// factors writes x as c*a*b when x is a product, possibly scaled, that nothing
// else needs.
func (l *lowering) factors(x Node) (c float64, a, b Node, ok bool) {
	c, u := l.b.split(x)
	n := &l.b.nodes[u]
	if n.kind != kindMul || l.uses[x] != 1 || l.uses[u] != 1 {
		return 0, 0, 0, false
	}
	if _, done := l.value[u]; done {
		return 0, 0, 0, false
	}
	return c, n.a, n.b, true
}

// emit appends the operations for x, unless it is there already, and returns
// the number of its value.
func (l *lowering) emit(x Node) int32 {
	if v, ok := l.value[x]; ok {
		return v
	}
	n := l.b.nodes[x]
	switch n.kind {
	case kindConst:
		return l.push(x, op{code: opFill, a: none, b: none, e: none, c: n.imm})
	case kindScale:
		return l.emitScale(x, n)
	case kindAdd:
		return l.emitAdd(x, n)
	case kindMul:
		return l.push(x, op{code: opMul, a: l.emit(n.a), b: l.emit(n.b), e: none, c: 1})
	case kindDiv:
		return l.emitDiv(x, n, 1)
	case kindSin, kindCos:
		return l.emitTrig(x, n)
	case kindExp:
		c, u := l.b.split(n.a)
		return l.push(x, op{code: opExp, a: l.emit(u), b: none, e: none, c: c})
	case kindCall1:
		return l.push(x, op{code: opCall1, fn: n.fn, a: l.emit(n.a), b: none, e: none, c: n.imm})
	case kindCall2:
		return l.push(x, op{code: opCall2, fn: n.fn, a: l.emit(n.a), b: l.emit(n.b), e: none})
	}
	code := map[kind]opcode{kindSqrt: opSqrt, kindAbs: opAbs, kindFloor: opFloor, kindMin: opMin, kindMax: opMax, kindLog: opLog}[n.kind]
	o := op{code: code, a: l.emit(n.a), b: none, e: none}
	if n.operands() == 2 {
		o.b = l.emit(n.b)
	}
	return l.push(x, o)
}

func (l *lowering) emitScale(x Node, n node) int32 {
	_, done := l.value[n.a]
	if u := l.b.nodes[n.a]; !done && l.uses[n.a] == 1 {
		switch u.kind {
		case kindMul:
			return l.push(x, op{code: opMul, a: l.emit(u.a), b: l.emit(u.b), e: none, c: n.imm})
		case kindDiv:
			return l.emitDiv(x, u, n.imm)
		}
	}
	return l.push(x, op{code: opLin, a: l.emit(n.a), b: none, e: none, c: n.imm})
}

func (l *lowering) emitDiv(x Node, n node, c float64) int32 {
	if v, ok := l.b.constant(n.a); ok {
		return l.push(x, op{code: opRcp, a: l.emit(n.b), b: none, e: none, c: c * v})
	}
	return l.push(x, op{code: opDiv, a: l.emit(n.a), b: l.emit(n.b), e: none, c: c})
}

func (l *lowering) emitAdd(x Node, n node) int32 {
	if k, ok := l.b.constant(n.b); ok {
		if c, p, q, ok := l.factors(n.a); ok {
			return l.push(x, op{code: opFmaK, a: l.emit(p), b: l.emit(q), e: none, c: c, k: k})
		}
		c, u := l.b.split(n.a)
		return l.push(x, op{code: opLin, a: l.emit(u), b: none, e: none, c: c, k: k})
	}
	for _, t := range [][2]Node{{n.b, n.a}, {n.a, n.b}} { // the product, the rest
		if c, p, q, ok := l.factors(t[0]); ok {
			rest := l.emit(t[1])
			return l.push(x, op{code: opFma, a: l.emit(p), b: l.emit(q), e: rest, c: c})
		}
	}
	scaled, rest := n.b, n.a
	if l.b.nodes[n.b].kind != kindScale {
		scaled, rest = n.a, n.b
	}
	c, u := l.b.split(scaled)
	v := l.emit(rest)
	return l.push(x, op{code: opAxpy, a: l.emit(u), b: v, e: none, c: c})
}

func (l *lowering) emitTrig(x Node, n node) int32 {
	c, u := l.b.split(n.a)
	o := op{code: opSin, a: l.emit(u), b: none, e: none, c: c}
	if n.kind == kindCos {
		o.code = opCos
	}
	if !l.paired[n.a] {
		return l.push(x, o)
	}
	o.code = opSinCos
	o.d2 = l.values + 1
	v := l.push(x, o)
	l.values++
	sin, cos := l.b.Sin(n.a), l.b.Cos(n.a)
	l.value[sin], l.value[cos] = v, v+1
	return l.value[x]
}

// lastReads returns for each value the number of the last operation that reads it.
func (l *lowering) lastReads() []int {
	last := make([]int, l.values)
	for i, o := range l.ops {
		for _, v := range [...]int32{o.a, o.b, o.e} {
			if v >= 0 {
				last[v] = i
			}
		}
	}
	return last
}

// allocate replaces values by rows: inputs, then outputs, then temporaries,
// which are reused once their last reader is done. No operation writes a row it
// reads: the kernels with a slow path look at their operand again afterwards.
func (l *lowering) allocate(results []int32) *Program {
	nin, nout := int32(len(l.b.inputs)), int32(len(results))
	row := make([]int32, l.values)
	for i := range row {
		row[i] = none
		if int32(i) < nin {
			row[i] = int32(i)
		}
	}
	var tail []op
	for i, v := range results {
		if row[v] == none {
			row[v] = nin + int32(i)
		} else {
			tail = append(tail, op{code: opCopy, d: nin + int32(i), a: row[v], b: none, e: none})
		}
	}
	last := l.lastReads()
	rows := nin + nout
	var free []int32
	take := func(v int32) {
		if row[v] != none {
			return
		}
		if k := len(free) - 1; k >= 0 {
			row[v], free = free[k], free[:k]
			return
		}
		row[v] = rows
		rows++
	}
	ops := make([]op, 0, len(l.ops)+len(tail))
	for i, o := range l.ops {
		r := o
		take(o.d)
		r.d = row[o.d]
		if o.code == opSinCos {
			take(o.d2)
			r.d2 = row[o.d2]
		}
		seen := [3]int32{none, none, none}
		for j, p := range [...]*int32{&r.a, &r.b, &r.e} {
			v := *p
			if v < 0 {
				continue
			}
			*p = row[v]
			if last[v] == i && row[v] >= nin+nout && !slices.Contains(seen[:], v) {
				free = append(free, row[v])
			}
			seen[j] = v
		}
		// A result that nothing reads is a temporary for this operation alone.
		written := [2]int32{o.d, o.d}
		if o.code == opSinCos {
			written[1] = o.d2
		}
		for _, v := range written {
			if last[v] < i && row[v] >= nin+nout {
				free = append(free, row[v])
				last[v] = len(l.ops)
			}
		}
		ops = append(ops, r)
	}
	return &Program{inputs: l.b.Inputs(), outputs: int(nout), rows: int(rows), ops: append(ops, tail...)}
}
