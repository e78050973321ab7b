package ensemble_test

import (
	"context"
	"fmt"
	"os"

	"epslim/solver/ensemble"
	"epslim/solver/kernel"
)

// The temperature of a gel crawler relaxes to that of the gel:
// dT = -(T - 1) dt + dW/2, with the means 1 + 2 e^{-t} = 1.736, 1.271.
func ExampleRun() {
	g := kernel.NewBuilder("T")
	temperature := g.Input("T")
	m := &ensemble.Model{
		Graph:     g,
		Variables: []ensemble.Variable{{Name: "T", Start: 3}},
		Drift:     []kernel.Node{g.Sub(g.Const(1), temperature)},
		Noise:     [][]kernel.Node{{g.Const(0.5)}},
	}
	r, err := ensemble.Run(context.Background(), m, ensemble.Settings{To: 10000, Time: 2, Times: []float64{1, 2}, Seed: 1, Workers: 2})
	if err != nil {
		fmt.Println(err)
		return
	}
	for _, t := range r.Times {
		fmt.Printf("t = %v: mean %.3f +- %.3f, variance %.3f\n", t.Time, t.Mean[0], t.StdErr[0], t.Variance(0))
	}
	// Output:
	// t = 1: mean 1.731 +- 0.003, variance 0.108
	// t = 2: mean 1.271 +- 0.004, variance 0.123
}

// A rate is given with its interval, or not at all.
func ExampleFitRate() {
	seen := []ensemble.Point{{Eps: 0.2, Value: 0.041, StdErr: 0.001}, {Eps: 0.1, Value: 0.0098, StdErr: 0.001}}
	drowned := []ensemble.Point{{Eps: 0.2, Value: 0.002, StdErr: 0.001}, {Eps: 0.1, Value: 0.001, StdErr: 0.001}}
	fmt.Println(ensemble.FitRate(seen, 0))
	fmt.Println(ensemble.FitRate(drowned, 0))
	// Output:
	// 2.06 [1.77, 2.36]
	// noise floor reached
}

func ExampleSchemes() {
	for _, s := range ensemble.Schemes() {
		fmt.Fprintf(os.Stdout, "%s: weak order %v, %s\n", s.Name, s.WeakOrder, s.Interpretation)
	}
	// Output:
	// euler: weak order 1, Ito
	// platen2: weak order 2, Ito
	// splitting: weak order 2, Ito
}
