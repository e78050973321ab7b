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
