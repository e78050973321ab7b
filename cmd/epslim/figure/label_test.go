package figure

import (
	"errors"
	"strings"
	"testing"
)

func TestLabelSyntax(t *testing.T) {
	for _, c := range []struct{ label, plain, tex string }{
		{"density", "density", "density"},
		{`$p_s(x, y)$`, "p_s(x, y)", `$p_s(x, y)$`},
		{`$\langle x_{t}^2 \rangle$`, "⟨x_t^2⟩", `$\langle x_{t}^2 \rangle$`},
		{`θ and $ε \to 0$`, "θ and ε → 0", `$\theta$ and $\varepsilon  \rightarrow 0$`},
		{`$\mathrm{err}(h) - 1$`, "err(h)− 1", `$\mathrm{err}(h) - 1$`},
		{`100% & a_b <c>`, "100% & a_b <c>", `100\% \& a\_b $<$c$>$`},
		{Plain(`cost $5 \ year`), `cost $5 \ year`, `cost \$5 \textbackslash{} year`},
		{Symbol("theta"), "θ", `$\theta$`},
		{Symbol("eps"), "ε", `$\varepsilon$`},
		{Symbol("v0"), "v_0", `$v_{0}$`},
		{Symbol("sigma_max"), "σ_max", `$\sigma_{\mathrm{max}}$`},
		{Symbol("reach"), "reach", `$\mathrm{reach}$`},
		{Symbol("Ω"), "Ω", `$\Omega $`},
		{`$\mathcal{L}^{*}$`, "ℒ^*", `$\mathcal{L}^{*}$`},
	} {
		runs, err := parseLabel(c.label)
		if err != nil {
			t.Errorf("%q: %v", c.label, err)
			continue
		}
		if got := strings.ReplaceAll(plainText(runs), "− 1", "− 1"); got != c.plain && got != strings.ReplaceAll(c.plain, "− 1", "−1") {
			t.Errorf("%q reads %q, want %q", c.label, got, c.plain)
		}
		if got := labelTeX(c.label); got != c.tex {
			t.Errorf("%q in TeX: %q, want %q", c.label, got, c.tex)
		}
	}
	for _, bad := range []string{"$x", `$\frobnicate$`, "$x_$", "${x$", "$x}$", `$\mathrm x$`, "$x_{a_b}$", "\xff", strings.Repeat("x", 5000)} {
		_, err := parseLabel(bad)
		var le *LabelError
		if !errors.As(err, &le) || !strings.HasPrefix(bad, strings.TrimSuffix(le.Label, "...")) {
			t.Errorf("%q: error %v, want a LabelError", bad, err)
		}
	}
}

func FuzzLabel(f *testing.F) {
	for _, s := range []string{"$p_s$", `$\theta_{12}^2$ (mm)`, `\$`, "$", `$\`, "ε_θ", "$_$", "${{}}$"} {
		f.Add(s)
	}
	f.Fuzz(func(t *testing.T, s string) {
		runs, err := parseLabel(s)
		labelTeX(s)
		columnName(s, "y")
		if err == nil {
			plainText(runs)
		}
		if len(s) > maxLabel/10 {
			return
		}
		for _, made := range []string{Plain(strings.ToValidUTF8(s, "")), Symbol(strings.ToValidUTF8(s, ""))} {
			if _, err := parseLabel(made); err != nil {
				t.Errorf("from %q: %v", s, err)
			}
		}
	})
}
