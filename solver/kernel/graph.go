package kernel

import "fmt"

// operands returns the number of operands of n.
func (n *node) operands() int {
	switch n.kind {
	case kindConst, kindInput:
		return 0
	case kindAdd, kindMul, kindDiv, kindMin, kindMax, kindCall2:
		return 2
	}
	return 1
}

// Import copies the nodes below outs from src into b, with each input of src
// replaced by its binding; unbound inputs keep their name. It returns the
// copies of outs in the same order. src may be b itself: that is substitution.
func (b *Builder) Import(src *Builder, outs []Node, bind map[string]Node) []Node {
	if src.err != nil {
		b.fail(src.err)
	}
	memo := map[Node]Node{}
	result := make([]Node, len(outs))
	for i, x := range outs {
		result[i] = b.importNode(src, x, bind, memo)
	}
	return result
}

func (b *Builder) importNode(src *Builder, x Node, bind map[string]Node, memo map[Node]Node) Node {
	if !src.ok(x) {
		return b.fail(fmt.Errorf("kernel: node %d is not a node of the imported builder", x))
	}
	if y, ok := memo[x]; ok {
		return y
	}
	n := src.nodes[x]
	var p, q, y Node
	if k := n.operands(); k > 0 {
		p = b.importNode(src, n.a, bind, memo)
		if k > 1 {
			q = b.importNode(src, n.b, bind, memo)
		}
	}
	switch n.kind {
	case kindConst:
		y = b.Const(n.imm)
	case kindInput:
		name := src.inputs[int(n.imm)]
		var ok bool
		if y, ok = bind[name]; !ok {
			y = b.Input(name)
		}
	case kindScale:
		y = b.Scale(n.imm, p)
	case kindAdd:
		y = b.Add(p, q)
	case kindMul:
		y = b.Mul(p, q)
	case kindDiv:
		y = b.Div(p, q)
	case kindSqrt:
		y = b.Sqrt(p)
	case kindAbs:
		y = b.Abs(p)
	case kindFloor:
		y = b.Floor(p)
	case kindMin:
		y = b.Min(p, q)
	case kindMax:
		y = b.Max(p, q)
	case kindSin:
		y = b.Sin(p)
	case kindCos:
		y = b.Cos(p)
	case kindExp:
		y = b.Exp(p)
	case kindLog:
		y = b.Log(p)
	case kindCall1:
		y = b.call1(n.fn, p, n.imm)
	case kindCall2:
		y = b.call2(n.fn, p, q)
	}
	memo[x] = y
	return y
}

// DependsOn reports whether x contains any of the named inputs.
func (b *Builder) DependsOn(x Node, names ...string) bool {
	want := map[Node]bool{}
	for _, name := range names {
		for i, s := range b.inputs {
			if s == name {
				want[b.Input(b.inputs[i])] = true
			}
		}
	}
	memo := map[Node]bool{}
	var visit func(Node) bool
	visit = func(y Node) bool {
		if r, ok := memo[y]; ok {
			return r
		}
		n := b.nodes[y]
		r := want[y]
		if k := n.operands(); !r && k > 0 {
			r = visit(n.a) || k > 1 && visit(n.b)
		}
		memo[y] = r
		return r
	}
	return b.ok(x) && visit(x)
}

// Affine writes x as constant + sum_i slope[i]*names[i] where neither the
// constant nor the slopes contain any of the named inputs. The decomposition is
// structural: ok is false where the form of x does not show it.
func (b *Builder) Affine(x Node, names ...string) (constant Node, slope []Node, ok bool) {
	if !b.ok(x) {
		return 0, nil, false
	}
	slope = make([]Node, len(names))
	if !b.DependsOn(x, names...) {
		return x, slope, true
	}
	n := b.nodes[x]
	combine := func(c Node, s []Node, f func(Node) Node) (Node, []Node, bool) {
		for i := range s {
			s[i] = f(s[i])
		}
		return f(c), s, true
	}
	switch n.kind {
	case kindInput:
		for i, name := range names {
			if b.inputs[int(n.imm)] == name {
				slope[i] = b.Const(1)
			}
		}
		return 0, slope, true
	case kindScale:
		if c, s, ok := b.Affine(n.a, names...); ok {
			return combine(c, s, func(y Node) Node { return b.Scale(n.imm, y) })
		}
	case kindAdd:
		c, s, ok1 := b.Affine(n.a, names...)
		d, t, ok2 := b.Affine(n.b, names...)
		if ok1 && ok2 {
			for i := range s {
				s[i] = b.Add(s[i], t[i])
			}
			return b.Add(c, d), s, true
		}
	case kindMul:
		p, q := n.a, n.b
		if b.DependsOn(p, names...) {
			p, q = q, p
		}
		if c, s, ok := b.Affine(q, names...); ok && !b.DependsOn(p, names...) {
			return combine(c, s, func(y Node) Node { return b.Mul(p, y) })
		}
	case kindDiv:
		if c, s, ok := b.Affine(n.a, names...); ok && !b.DependsOn(n.b, names...) {
			return combine(c, s, func(y Node) Node { return b.Div(y, n.b) })
		}
	}
	return 0, nil, false
}
