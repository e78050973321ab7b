package present

import (
	"math/big"

	"epslim/generator/algebra"
	"epslim/perturb"
)

// limit is the limiting SDE.
func (t *teller) limit() Section {
	res, lim := t.res, t.res.Limit
	sec := Section{ID: "limit", Title: "Limit"}
	p := Para{text("As "), inline(join(t.eps, op("→", `\to`), integer(0))), text(" on times "), inline(join(t.own("t"), equals, glue(t.epsTo(new(big.Rat).Neg(lim.Power)), t.own("T")))), text(" (" + lim.Regime + ")")}
	if lim.Power.Sign() == 0 {
		p = Para{text("As "), inline(join(t.eps, op("→", `\to`), integer(0))), text(" (" + lim.Regime + ")")}
	}
	noise := res.Noise
	if noise == nil {
		noise = make([][]algebra.Expr, len(t.names))
	}
	random := len(noise) > 0 && len(noise[0]) > 0
	if random {
		p = append(p, text(", in the Itô sense"))
	}
	sec.Blocks = append(sec.Blocks, append(p, text(":")))
	var ls []Line
	for i, v := range t.names {
		ls = append(ls, t.timed(t.sde(v, lim.Drift[i], noise[i], nil, false)))
	}
	sec.Blocks = append(sec.Blocks, Equations{ID: "ito", Lines: ls})
	if res.NoiseError != nil {
		sec.Blocks = append(sec.Blocks, Para{text("A factor of the diffusion matrix was not found in closed form (" + res.NoiseError.Error() + "); its entries are below.")})
	}
	if random && res.Stratonovich != nil {
		sec.Blocks = append(sec.Blocks, t.stratonovich(noise)...)
	}
	sec.Blocks = append(sec.Blocks, t.diffusion()...)
	return sec
}

// frame tells that a large mean drift was subtracted.
func (t *teller) frame() Section {
	f := t.res.Limit.Frame
	sec := Section{ID: "frame", Title: "Moving frame"}
	if f == nil {
		return sec
	}
	var ls []Line
	for i, v := range f.Velocity {
		ls = append(ls, line(sub(t.own("c"), t.symbol(t.names[i])), equals, t.terms(v)...))
	}
	p := Para{text("The large drift has the mean "), inline(glue(t.epsTo(f.Power), t.own("c"))), text(", which was subtracted: the limit below is that of the deviation from the point that moves with it. With")}
	if f.Short {
		p = Para{text("The large drift has the mean "), inline(glue(t.epsTo(f.Power), t.own("c"))), text(", and no frame can move with it, because the model varies along the way: the limit below is the averaging limit on the shorter time scale. With")}
	}
	return t.withBlocks(sec, p, Equations{ID: "frame", Lines: ls})
}

// next is the corrections beyond the limit, where they were asked for.
func (t *teller) next() Section {
	sec := Section{ID: "next", Title: "Beyond the limit"}
	for _, c := range t.res.Limit.Corrections {
		var ls []Line
		for i, n := range t.names {
			ls = append(ls, line(sub(t.own("f"), t.symbol(n)), equals, t.atMost(c.Drift[i])...))
		}
		for i := range t.names {
			for j := i; j < len(t.names); j++ {
				ls = append(ls, line(t.entry(i, j), equals, t.atMost(c.Diffusion[i][j])...))
			}
		}
		p := Para{text("At the relative order "), inline(power(t.eps, c.Power)), text(" the generator gains the drift "), inline(t.own("f")), text(" and the diffusion matrix "), inline(t.own("A")), text(":")}
		sec.Blocks = append(sec.Blocks, p, Equations{Lines: ls})
		if c.Residual.Valid() && !c.Residual.IsZero() && !t.res.Route.IsNumerical(c.Residual) {
			sec.Blocks = append(sec.Blocks, Para{text("Its corrector leaves a residual: do not use this correction.")})
		}
		if c.Higher.Valid() && !c.Higher.IsZero() {
			sec.Blocks = append(sec.Blocks, Para{text("It also gains derivatives of third or higher order, so that the corrected equation is not that of a diffusion.")})
		}
	}
	switch up := t.res.Limit.UpTo; {
	case up == nil:
	case len(t.res.Limit.Corrections) == 0:
		sec.Blocks = append(sec.Blocks, Para{text("Up to the relative order "), inline(power(t.eps, up)), text(" the corrections vanish.")})
	default:
		sec.Blocks = append(sec.Blocks, Para{text("The corrected operator governs the average of u over the fast process after the initial layer. Its initial value differs from that of the limit at the same order, so stationary averages must not be read off the corrected drift and diffusion alone.")})
	}
	return sec
}

// timed replaces t by T where the limit lives on a longer time.
func (t *teller) timed(l Line) Line {
	if t.res.Limit.Power.Sign() == 0 {
		return l
	}
	tv := t.timeVariable()
	for i, x := range l.Right {
		if x.Post.Text == "dt" {
			l.Right[i].Post = Math{"d" + tv.Text, `\mathrm{d}` + tv.TeX, upright("d") + tv.MathML}
		}
	}
	return l
}

func (t *teller) stratonovich(noise [][]algebra.Expr) []Block {
	res := t.res
	var corr, ls []Line
	for i, v := range t.names {
		c := res.Limit.Drift[i].Sub(res.Stratonovich[i])
		x := t.symbol(v)
		left := join(sub(t.own("c"), x))
		corr = append(corr, line(left, equals, t.terms(c)...))
		ls = append(ls, t.timed(t.sde(v, res.Stratonovich[i], noise[i], nil, true)))
	}
	def := join(sub(t.own("c"), lit("i", "i")), equals, half, thin, bare("Σ", `\textstyle\sum_{j,k}`), thin, sub(t.own("σ"), join(lit("j", "j"), lit("k", "k"))), thin,
		Math{"∂_j", `\partial_{j}`, "<msub><mi>∂</mi><mi>j</mi></msub>"}, thin, sub(t.own("σ"), join(lit("i", "i"), lit("k", "k"))))
	return []Block{
		Para{text("The Stratonovich drift is smaller by the correction "), inline(def), text(":")},
		Equations{ID: "correction", Lines: corr},
		Para{text("In the Stratonovich sense:")},
		Equations{ID: "stratonovich", Lines: ls},
	}
}

// diffusion lists A = sigma sigma^T.
func (t *teller) diffusion() []Block {
	var ls []Line
	zero := true
	a := t.res.Limit.Diffusion
	for i := range t.names {
		for j := i; j < len(t.names); j++ {
			zero = zero && a[i][j].IsZero()
			ls = append(ls, line(sub(t.own("A"), join(t.symbol(t.names[i]), t.symbol(t.names[j]))), equals, t.terms(a[i][j])...))
		}
	}
	if zero {
		return []Block{Para{text("The limit is deterministic.")}}
	}
	p := Para{text("The diffusion matrix "), inline(join(t.own("A"), equals, t.own("σ"), transposed(t.own("σ"))))}
	if t.res.Noise != nil {
		p = append(p, note(" (the sign of a column of σ and a rotation of its columns do not change the law)"))
	}
	return []Block{append(p, text(":")), Equations{ID: "diffusion", Lines: ls}}
}

// originWords explains the origins of drift terms.
var originWords = map[string]string{
	perturb.OriginAveraged:    "the slow drift, averaged over the fast process",
	perturb.OriginFluctuation: "induced by the fluctuations of the large drift",
	perturb.OriginFastLaw:     "the fast process itself varies with the slow variables",
	perturb.OriginShared:      "the slow and the fast equations share noise",
	perturb.OriginFastDrift:   "a weaker drift or noise of the fast variables",
	perturb.OriginHigher:      "second-order slow terms acting on the correctors",
}

func (t *teller) origins() Section {
	sec := Section{ID: "origins", Title: "Where each drift term comes from"}
	var ls []Line
	for i, ts := range t.res.Limit.Terms {
		for k, x := range ts {
			left, rel := join(t.symbol(t.names[i]), Math{":", ":", mo(":")}), Math{}
			if k > 0 {
				left = Math{}
			}
			l := line(left, rel, t.terms(x.Value)...)
			w, ok := originWords[x.Origin]
			if !ok {
				w = x.Origin
			}
			l.Note = cell(text(w))
			ls = append(ls, l)
		}
	}
	if len(ls) == 0 {
		return sec
	}
	return t.withBlocks(sec, Equations{ID: "origins", Lines: ls})
}
