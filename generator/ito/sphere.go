package ito

import (
	"math/big"
	"math/rand/v2"
	"strings"

	"epslim/generator/algebra"
	"epslim/generator/ito/diagnostic"
)

// spheres checks that equations on the unit sphere keep it: with
// y = (a, b, c) and |y| = 1, Ito's formula for |y|^2 gives
//
//	2 y.Drift + sum_k |Noise_k|^2 = 0 and y.Noise_k = 0 for each k.
func (r *reader) spheres() {
	s := r.system
	for _, sphere := range s.Spheres {
		var y [3]algebra.Expr
		var eqs [3]*Equation
		for i, n := range sphere.Names {
			y[i], eqs[i] = s.Variable(n).Expr, s.Equation(n)
		}
		err := algebra.Guard(func() error {
			one, two := r.ring.Int(1), r.ring.Int(2)
			rest := one.Sub(y[0].Mul(y[0])).Sub(y[1].Mul(y[1]))
			onSphere := func(e algebra.Expr) algebra.Expr { return e.ReduceSquare(sphere.Names[2], rest) }
			drift := r.ring.Int(0)
			for i := range y {
				drift = drift.Add(two.Mul(y[i]).Mul(eqs[i].Drift))
			}
			name := strings.Join([]string{sphere.Names[0] + "^2", sphere.Names[1] + "^2", sphere.Names[2] + "^2"}, " + ")
			for k, w := range s.Noises {
				radial := r.ring.Int(0)
				for i := range y {
					radial = radial.Add(y[i].Mul(eqs[i].Noise[k]))
					drift = drift.Add(eqs[i].Noise[k].Mul(eqs[i].Noise[k]))
				}
				if radial = onSphere(radial); !r.vanishes(sphere, radial) {
					r.leaves(eqs, name, "d"+w, two.Mul(radial))
					return nil
				}
			}
			if drift = onSphere(drift); !r.vanishes(sphere, drift) {
				r.leaves(eqs, name, "dt", drift)
			}
			return nil
		})
		if err != nil {
			r.fail(eqs[0].Position, diagnostic.TooComplex, "the equations on the sphere are too large to be worked out")
		}
	}
}

// leaves reports equations that do not keep the sphere, at the first of them.
func (r *reader) leaves(eqs [3]*Equation, name, differential string, rate algebra.Expr) {
	d := r.fail(eqs[0].Position, diagnostic.LeavesSphere, "the equations leave the sphere: d("+name+") has the term ("+shorten(rate.String())+") "+differential)
	d.Expected = "equations for which d(" + name + ") = 0, such as the rotational diffusion da = -2*D*a/eps^2 dt + sqrt(2*D)/eps*(b dW3 - c dW2), ..."
}

const (
	sphereAttempts = 24
	spherePoints   = 4
	sphereBits     = 256
)

// vanishes tells whether an expression is zero on the sphere. What is polynomial
// in the components has been reduced, and canonical zero decides. Where the
// components stand under roots and the like, the expression is evaluated at
// points of the sphere; when it is zero to 40 digits there, the equations are
// accepted with a warning that says how far they were checked.
func (r *reader) vanishes(sphere Sphere, e algebra.Expr) bool {
	if e.IsZero() {
		return true
	}
	good := 0
	random := rand.New(rand.NewPCG(1, 2))
	for range sphereAttempts {
		at := algebra.Binding{Arbitrary: true, Values: map[string]*big.Float{}}
		for _, name := range e.Symbols() {
			at.Values[name] = r.sampleOf(name, random)
		}
		u, v := 1.6*random.Float64()-0.8, 0.5*random.Float64()
		a := new(big.Float).SetPrec(sphereBits).SetFloat64(u)
		b := new(big.Float).SetPrec(sphereBits).SetFloat64(v)
		c := new(big.Float).SetPrec(sphereBits).SetInt64(1)
		c.Sub(c, new(big.Float).SetPrec(sphereBits).Mul(a, a))
		c.Sub(c, new(big.Float).SetPrec(sphereBits).Mul(b, b))
		c.Sqrt(c)
		if random.IntN(2) == 0 {
			c.Neg(c)
		}
		at.Values[sphere.Names[0]], at.Values[sphere.Names[1]], at.Values[sphere.Names[2]] = a, b, c
		value, err := e.EvalBig(at, sphereBits)
		if err != nil {
			continue
		}
		if value.Sign() != 0 && value.MantExp(nil) > -130 {
			return false
		}
		if good++; good == spherePoints {
			at := r.system.Variable(sphere.Names[0]).Position
			r.system.Warnings = append(r.system.Warnings, r.file.Source.Diagnostic(at, diagnostic.LeavesSphere,
				"that the equations keep the sphere was checked to 40 digits at "+itoa(good)+" points, not proven"))
			return true
		}
	}
	return false
}

// sampleOf returns a number of moderate size with the declared sign.
func (r *reader) sampleOf(name string, random *rand.Rand) *big.Float {
	x := 0.3 + random.Float64()
	if e := r.entities[name]; e != nil && e.kind == entityParam {
		switch {
		case e.sign.integer:
			x = float64(1 + random.IntN(4))
		case e.sign.sign == algebra.Negative:
			x = -x
		}
	}
	return big.NewFloat(x)
}
