package ensemble

import (
	"math"

	"epslim/solver/kernel"
)

// crawler is the full model of a gel crawler: dx = v cos(theta)/eps dt, dy = v
// sin(theta)/eps dt, dtheta = sqrt(2)/eps dW, v = 1 + sin(2 pi x) cos(2 pi y)/2.
func crawler(eps float64) *Model {
	g := kernel.NewBuilder("x", "y", "theta")
	x, y, th := g.Input("x"), g.Input("y"), g.Input("theta")
	v := crawlerSpeed(g, x, y)
	s, c := g.SinCos(th)
	e := g.Input("eps")
	return &Model{
		Graph: g,
		Variables: []Variable{
			{Name: "x", Domain: Domain{Kind: Periodic, Hi: 1}, Start: 0.1},
			{Name: "y", Domain: Domain{Kind: Periodic, Hi: 1}, Start: 0.2},
			{Name: "theta", Domain: Domain{Kind: Circle}, Fast: true, Start: 0.3},
		},
		Drift:      []kernel.Node{g.Div(g.Mul(v, c), e), g.Div(g.Mul(v, s), e), 0},
		Noise:      [][]kernel.Node{{0}, {0}, {g.Div(g.Const(math.Sqrt2), e)}},
		Parameters: map[string]float64{"eps": eps},
		Eps:        eps,
	}
}

func crawlerSpeed(g *kernel.Builder, x, y kernel.Node) kernel.Node {
	return g.Add(g.Const(1), g.Scale(0.5, g.Mul(g.Sin(g.Scale(2*math.Pi, x)), g.Cos(g.Scale(2*math.Pi, y)))))
}

// crawlerLimit is its limit: dX = v grad v/2 dt + v dW.
func crawlerLimit() *Model {
	g := kernel.NewBuilder("x", "y")
	x, y := g.Input("x"), g.Input("y")
	v := crawlerSpeed(g, x, y)
	sx, cx := g.SinCos(g.Scale(2*math.Pi, x))
	sy, cy := g.SinCos(g.Scale(2*math.Pi, y))
	return &Model{
		Graph: g,
		Variables: []Variable{
			{Name: "x", Domain: Domain{Kind: Periodic, Hi: 1}, Start: 0.1},
			{Name: "y", Domain: Domain{Kind: Periodic, Hi: 1}, Start: 0.2},
		},
		Drift: []kernel.Node{g.Scale(0.5*math.Pi, g.Prod(v, cx, cy)), g.Scale(-0.5*math.Pi, g.Prod(v, sx, sy))},
		Noise: [][]kernel.Node{{v, 0}, {0, v}},
	}
}

// geometric is dX = mu X dt + sigma X dW with E X(t) = e^{mu t} and
// E X(t)^2 = e^{(2 mu + sigma^2) t} from X(0) = 1.
func geometric(mu, sigma float64) *Model {
	g := kernel.NewBuilder("x")
	x := g.Input("x")
	return &Model{
		Graph:       g,
		Variables:   []Variable{{Name: "x", Start: 1}},
		Drift:       []kernel.Node{g.Scale(mu, x)},
		Noise:       [][]kernel.Node{{g.Scale(sigma, x)}},
		Observables: []Observable{{"x", x}, {"x^2", g.Mul(x, x)}},
	}
}

// relaxing is the Ornstein-Uhlenbeck process dY = -k Y dt + s dW.
func relaxing(k, s, start float64, fast bool) *Model {
	g := kernel.NewBuilder("y")
	y := g.Input("y")
	return &Model{
		Graph:       g,
		Variables:   []Variable{{Name: "y", Fast: fast, Start: start}},
		Drift:       []kernel.Node{g.Scale(-k, y)},
		Noise:       [][]kernel.Node{{g.Const(s)}},
		Observables: []Observable{{"y", y}, {"y^2", g.Mul(y, y)}},
	}
}

// area is dX = dW1, dY = X dW2, whose noise does not commute: E Y(t)^2 = t^2/2.
func area() *Model {
	g := kernel.NewBuilder("x", "y")
	x, y := g.Input("x"), g.Input("y")
	return &Model{
		Graph:       g,
		Variables:   []Variable{{Name: "x"}, {Name: "y"}},
		Drift:       []kernel.Node{0, 0},
		Noise:       [][]kernel.Node{{g.Const(1), 0}, {0, x}},
		Observables: []Observable{{"y^2", g.Mul(y, y)}},
	}
}

// coloured is dx = y/eps dt, dy = -y/eps^2 dt + dW/eps from 0: x^2 has the mean
// t - 2 eps^2 (1 - e^{-t/eps^2}) + eps^2 (1 - e^{-2t/eps^2})/2 (G. E. Uhlenbeck
// and L. S. Ornstein, Phys. Rev. 36 (1930) 823, the displacement from rest).
func coloured(eps float64) *Model {
	g := kernel.NewBuilder("x", "y")
	x, y := g.Input("x"), g.Input("y")
	return &Model{
		Graph:       g,
		Variables:   []Variable{{Name: "x"}, {Name: "y", Fast: true}},
		Drift:       []kernel.Node{g.Scale(1/eps, y), g.Scale(-1/(eps*eps), y)},
		Noise:       [][]kernel.Node{{0}, {g.Const(1 / eps)}},
		Observables: []Observable{{"x^2", g.Mul(x, x)}},
		Eps:         eps,
	}
}

func colouredSquare(eps, t float64) float64 {
	e := eps * eps
	return t - 2*e*(1-math.Exp(-t/e)) + e*(1-math.Exp(-2*t/e))/2
}

// brownian is dX = dW in a domain.
func brownian(d Domain, start float64) *Model {
	g := kernel.NewBuilder("x")
	x := g.Input("x")
	return &Model{
		Graph:       g,
		Variables:   []Variable{{Name: "x", Domain: d, Start: start}},
		Drift:       []kernel.Node{0},
		Noise:       [][]kernel.Node{{g.Const(1)}},
		Observables: []Observable{{"x", x}, {"cos(pi x)", g.Cos(g.Scale(math.Pi, x))}},
	}
}

// squareRoot is dY = k (m - Y) dt + s sqrt(Y) dW on the half-line.
func squareRoot(k, m, s, start float64) *Model {
	g := kernel.NewBuilder("y")
	y := g.Input("y")
	return &Model{
		Graph:     g,
		Variables: []Variable{{Name: "y", Domain: Domain{Kind: HalfLine}, Start: start}},
		Drift:     []kernel.Node{g.Scale(k, g.Sub(g.Const(m), y))},
		Noise:     [][]kernel.Node{{g.Scale(s, g.Sqrt(y))}},
	}
}

// compass is rotational diffusion of a unit vector n: dn = -2 D n dt + sqrt(2 D)
// (1 - n n^T) dW, with E n(t) = e^{-2Dt} n(0).
func compass(d float64) *Model {
	g := kernel.NewBuilder("a", "b", "c")
	n := []kernel.Node{g.Input("a"), g.Input("b"), g.Input("c")}
	m := &Model{Graph: g}
	for i, name := range []string{"a", "b", "c"} {
		m.Variables = append(m.Variables, Variable{Name: name, Domain: Domain{Kind: Sphere}, Start: []float64{0.6, 0, 0.8}[i]})
		m.Drift = append(m.Drift, g.Scale(-2*d, n[i]))
		var row []kernel.Node
		for j := range n {
			e := g.Neg(g.Mul(n[i], n[j]))
			if i == j {
				e = g.Add(e, g.Const(1))
			}
			row = append(row, g.Scale(math.Sqrt(2*d), e))
		}
		m.Noise = append(m.Noise, row)
	}
	length := g.Sum(g.Mul(n[0], n[0]), g.Mul(n[1], n[1]), g.Mul(n[2], n[2]))
	m.Observables = []Observable{{"a", n[0]}, {"c", n[2]}, {"length^2", length}}
	return m
}

// exploding is dX = X^3 dt + dW: some paths reach infinity in finite time.
func exploding() *Model {
	g := kernel.NewBuilder("x")
	x := g.Input("x")
	return &Model{
		Graph:     g,
		Variables: []Variable{{Name: "x", Start: 0.3}},
		Drift:     []kernel.Node{g.PowInt(x, 3)},
		Noise:     [][]kernel.Node{{g.Const(1)}},
	}
}

// rotating is a pair of coupled linear fast variables with one Wiener process.
func rotating() *Model {
	g := kernel.NewBuilder("p", "q")
	p, q := g.Input("p"), g.Input("q")
	return &Model{
		Graph:     g,
		Variables: []Variable{{Name: "p", Fast: true, Start: 1}, {Name: "q", Fast: true, Start: -0.5}},
		Drift: []kernel.Node{
			g.Sum(g.Const(0.3), g.Neg(p), g.Scale(-2, q)),
			g.Sum(g.Const(-0.1), g.Scale(2, p), g.Scale(-1.5, q)),
		},
		Noise:       [][]kernel.Node{{g.Const(0.7)}, {g.Const(0.4)}},
		Observables: []Observable{{"p", p}, {"q", q}, {"p^2", g.Mul(p, p)}, {"p q", g.Mul(p, q)}, {"q^2", g.Mul(q, q)}},
	}
}

// sharedNoise drives a slow and a fast variable by one Wiener process.
func sharedNoise() *Model {
	m := coloured(0.3)
	m.Noise[0][0] = m.Graph.Const(1)
	return m
}

// nonlinearFast has a fast variable whose drift is not linear.
func nonlinearFast() *Model {
	m := coloured(0.3)
	y := m.Graph.Input("y")
	m.Drift[1] = m.Graph.Neg(m.Graph.PowInt(y, 3))
	return m
}

// patchy has a fast variable whose relaxation and noise depend on the slow one.
func patchy(eps float64) *Model {
	g := kernel.NewBuilder("x", "y", "theta")
	x, y, th := g.Input("x"), g.Input("y"), g.Input("theta")
	k := g.Add(g.Const(1), g.Scale(0.5, g.Sin(x)))
	m := &Model{
		Graph:     g,
		Variables: []Variable{{Name: "x", Start: 0.4}, {Name: "y", Fast: true, Start: 1}, {Name: "theta", Domain: Domain{Kind: Circle}, Fast: true}},
		Drift: []kernel.Node{
			g.Sum(g.Scale(1/eps, y), g.Scale(0.3/eps, g.Cos(th)), g.Neg(x)),
			g.Scale(1/(eps*eps), g.Sub(g.Scale(0.2, g.Cos(x)), g.Mul(k, y))),
			g.Scale(1/eps, x),
		},
		Noise: [][]kernel.Node{{g.Const(0.3), 0, 0}, {0, g.Scale(1/eps, g.Sqrt(k)), 0}, {0, 0, g.Scale(1/eps, k)}},
		Eps:   eps,
	}
	m.Observables = []Observable{{"x", x}, {"x^2", g.Mul(x, x)}, {"y^2", g.Mul(y, y)}, {"cos", g.Cos(th)}}
	return m
}
