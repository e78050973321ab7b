//go:build unix

package main

import (
	"math"

	"epslim/solver/ensemble"
	"epslim/solver/kernel"
)

type node = kernel.Node

// modelNames lists the models in the order of the table.
func modelNames() []string {
	return []string{"1", "2", "geometric", "double well", "coloured noise", "predator-prey", "square root", "pendulum", "sphere", "ring of four"}
}

func variables(names ...string) []ensemble.Variable {
	var list []ensemble.Variable
	for _, name := range names {
		list = append(list, ensemble.Variable{Name: name, Start: 0.2})
	}
	return list
}

// models are the two models of the peers, named "1" and "2", and eight others.
func models() map[string]*ensemble.Model {
	return map[string]*ensemble.Model{
		"1": crawler(0.1), "2": crawlerLimit(),
		"geometric":      geometric(),
		"double well":    doubleWell(),
		"coloured noise": colouredNoise(),
		"predator-prey":  predatorPrey(),
		"square root":    squareRoot(),
		"pendulum":       pendulum(),
		"sphere":         sphere(),
		"ring of four":   ring(),
	}
}

func crawler(eps float64) *ensemble.Model {
	g := kernel.NewBuilder("x", "y", "theta")
	x, y := g.Input("x"), g.Input("y")
	v := g.Add(g.Const(1), g.Scale(0.5, g.Mul(g.Sin(g.Scale(2*math.Pi, x)), g.Cos(g.Scale(2*math.Pi, y)))))
	s, c := g.SinCos(g.Input("theta"))
	m := &ensemble.Model{Graph: g, Variables: variables("x", "y", "theta"), Eps: eps,
		Drift: []node{g.Scale(1/eps, g.Mul(v, c)), g.Scale(1/eps, g.Mul(v, s)), 0},
		Noise: [][]node{{0}, {0}, {g.Const(math.Sqrt2 / eps)}}}
	m.Variables[0].Domain = ensemble.Domain{Kind: ensemble.Periodic, Hi: 1}
	m.Variables[1].Domain = ensemble.Domain{Kind: ensemble.Periodic, Hi: 1}
	m.Variables[2].Domain = ensemble.Domain{Kind: ensemble.Circle}
	m.Variables[2].Fast = true
	return m
}

func crawlerLimit() *ensemble.Model {
	g := kernel.NewBuilder("x", "y")
	sx, cx := g.SinCos(g.Scale(2*math.Pi, g.Input("x")))
	sy, cy := g.SinCos(g.Scale(2*math.Pi, g.Input("y")))
	v := g.Add(g.Const(1), g.Scale(0.5, g.Mul(sx, cy)))
	m := &ensemble.Model{Graph: g, Variables: variables("x", "y"),
		Drift: []node{g.Scale(math.Pi/2, g.Prod(v, cx, cy)), g.Scale(-math.Pi/2, g.Prod(v, sx, sy))},
		Noise: [][]node{{v, 0}, {0, v}}}
	for i := range m.Variables {
		m.Variables[i].Domain = ensemble.Domain{Kind: ensemble.Periodic, Hi: 1}
	}
	return m
}

func geometric() *ensemble.Model {
	g := kernel.NewBuilder("x")
	x := g.Input("x")
	return &ensemble.Model{Graph: g, Variables: variables("x"), Drift: []node{g.Scale(0.1, x)}, Noise: [][]node{{g.Scale(0.3, x)}}}
}

func doubleWell() *ensemble.Model {
	g := kernel.NewBuilder("x")
	x := g.Input("x")
	return &ensemble.Model{Graph: g, Variables: variables("x"), Drift: []node{g.Sub(x, g.PowInt(x, 3))},
		Noise: [][]node{{g.Sqrt(g.Add(g.Const(0.1), g.Scale(0.2, g.Mul(x, x))))}}}
}

func colouredNoise() *ensemble.Model {
	g := kernel.NewBuilder("x", "y")
	x, y := g.Input("x"), g.Input("y")
	m := &ensemble.Model{Graph: g, Variables: variables("x", "y"),
		Drift: []node{g.Add(g.Neg(x), g.Scale(10, g.Mul(y, g.Exp(g.Neg(g.Mul(x, x)))))), g.Scale(-100, y)},
		Noise: [][]node{{0}, {g.Const(10)}}}
	m.Variables[1].Fast = true
	return m
}

func predatorPrey() *ensemble.Model {
	g := kernel.NewBuilder("p", "q")
	p, q := g.Input("p"), g.Input("q")
	xy := g.Mul(p, q)
	return &ensemble.Model{Graph: g, Variables: variables("p", "q"),
		Drift: []node{g.Sub(p, g.Scale(2, xy)), g.Sub(g.Scale(1.5, xy), q)},
		Noise: [][]node{{g.Scale(0.1, p), 0}, {0, g.Scale(0.1, q)}}}
}

func squareRoot() *ensemble.Model {
	g := kernel.NewBuilder("y")
	y := g.Input("y")
	m := &ensemble.Model{Graph: g, Variables: variables("y"), Drift: []node{g.Sub(g.Const(1), y)}, Noise: [][]node{{g.Sqrt(y)}}}
	m.Variables[0].Domain.Kind = ensemble.HalfLine
	return m
}

func pendulum() *ensemble.Model {
	g := kernel.NewBuilder("angle", "speed")
	a, v := g.Input("angle"), g.Input("speed")
	m := &ensemble.Model{Graph: g, Variables: variables("angle", "speed"),
		Drift: []node{v, g.Sum(g.Neg(g.Sin(a)), g.Scale(-0.3, v), g.Const(0.1))}, Noise: [][]node{{0}, {g.Const(0.5)}}}
	m.Variables[0].Domain.Kind = ensemble.Circle
	return m
}

func sphere() *ensemble.Model {
	g := kernel.NewBuilder("a", "b", "c")
	n := []node{g.Input("a"), g.Input("b"), g.Input("c")}
	m := &ensemble.Model{Graph: g, Variables: variables("a", "b", "c")}
	for i := range n {
		m.Variables[i].Domain.Kind = ensemble.Sphere
		m.Variables[i].Start = []float64{0.6, 0, 0.8}[i]
		m.Drift = append(m.Drift, g.Neg(n[i]))
		var row []node
		for j := range n {
			e := g.Neg(g.Mul(n[i], n[j]))
			if i == j {
				e = g.Add(e, g.Const(1))
			}
			row = append(row, e)
		}
		m.Noise = append(m.Noise, row)
	}
	return m
}

func ring() *ensemble.Model {
	g := kernel.NewBuilder("x1", "x2", "x3", "x4")
	m := &ensemble.Model{Graph: g, Variables: variables("x1", "x2", "x3", "x4")}
	for i := range 4 {
		x, y := g.Input(m.Variables[i].Name), g.Input(m.Variables[(i+1)%4].Name)
		m.Drift = append(m.Drift, g.Sum(g.Sin(g.Sub(y, x)), g.Log(g.Add(g.Const(1), g.Mul(x, x))), g.Neg(x)))
		row := make([]node, 4)
		row[i] = g.Div(g.Const(1), g.Add(g.Const(2), g.Cos(y)))
		m.Noise = append(m.Noise, row)
	}
	return m
}
