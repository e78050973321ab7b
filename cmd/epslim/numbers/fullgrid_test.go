package numbers

import (
	"context"
	"errors"
	"math"
	"strings"
	"testing"

	"epslim/cmd/epslim/derivation"
	"epslim/generator/ito"
)

func derived(t *testing.T, src string) *derivation.Result {
	t.Helper()
	sys, err := ito.Parse("gel.ito", []byte(src), ito.Options{})
	if err != nil {
		t.Fatal(err)
	}
	res, err := derivation.Run(context.Background(), sys, derivation.Options{SkipClaims: true})
	if err != nil {
		t.Fatal(err)
	}
	if res.Refused != nil {
		t.Fatalf("refused: %v", res.Refused)
	}
	return res
}

const linear = "slow x\nfast y\ndx = (y/eps - x) dt\ndy = -y/eps^2 dt + sqrt(2)/eps dW1\n"

// The linear system is Gaussian with the variance 1/(1+eps^2) in x by the
// Lyapunov equation, and 1 in the limit. Two centred Gaussians whose standard
// deviations differ by the small fraction q have the L1 distance
// 4 q/sqrt(2 pi e), from the integral of |x^2-1| phi(x); here q = eps^2/2.
func TestFullLinear(t *testing.T) {
	eps := []float64{0.2, 0.1, 0.05}
	f, err := SolveFull(context.Background(), derived(t, linear), eps, 1)
	if err != nil {
		t.Fatal(err)
	}
	for k, e := range eps[:2] {
		want := 4 * (e * e / 2) / math.Sqrt(2*math.Pi*math.E)
		if math.Abs(f.Distance[k]/want-1) > 0.1 {
			t.Errorf("eps %g: distance %g, want %g", e, f.Distance[k], want)
		}
	}
	if math.Abs(f.Rate-2) > 0.1 {
		t.Errorf("rate %g of %v (floor %g), want 2", f.Rate, f.Distance, f.Floor)
	}
	if v, why := f.Verdict(); v != FullAgrees || !strings.Contains(why, "observed rate") {
		t.Errorf("%v: %s", v, why)
	}
}

// A limit with another density than that of the model is found out.
func TestFullDiffers(t *testing.T) {
	res := derived(t, linear)
	other := derived(t, strings.Replace(linear, "- x)", "- 1.3*x)", 1))
	res.Limit, res.Stationary, res.Diffusion, res.Noise = other.Limit, other.Stationary, other.Diffusion, other.Noise
	f, err := SolveFull(context.Background(), res, []float64{0.2, 0.1, 0.05}, 1)
	if err != nil {
		t.Fatal(err)
	}
	if v, why := f.Verdict(); v != FullDiffers {
		t.Errorf("a wrong limit passed: %s", why)
	}
}

func TestFullRefusals(t *testing.T) {
	for _, c := range []struct{ src, want string }{
		{"slow x in [0, 1] reflecting\nfast y\ndx = y/eps dt\ndy = -y/eps^2 dt + 1/eps dW1\n", "slow variable x is neither"},
		{"slow x\nfast y\ndx = (y/eps - x) dt\ndy = -(y + y^3)/eps^2 dt + 1/eps dW1\n", "not linear"},
		{"slow x\nslow y\nslow z\nfast u\ndx = (u/eps - x) dt\ndy = -y dt + 1 dW2\ndz = -z dt + 1 dW3\ndu = -u/eps^2 dt + 1/eps dW1\n", "at most 2 slow"},
	} {
		_, err := SolveFull(context.Background(), derived(t, c.src), []float64{0.1}, 1)
		var no *NotOnGrid
		if !errors.As(err, &no) || !strings.Contains(no.Why, c.want) {
			t.Errorf("%q: %v", c.want, err)
		}
	}
	ctx, cancel := context.WithCancel(context.Background())
	res := derived(t, linear)
	cancel()
	if _, err := SolveFull(ctx, res, []float64{0.1}, 1); !errors.Is(err, context.Canceled) {
		t.Errorf("cancelled: %v", err)
	}
}
