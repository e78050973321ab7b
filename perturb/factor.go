package perturb

import "epslim/generator/algebra"

// Factor returns sigma with sigma sigma^T = A and as few columns as the rank
// of A, by outer-product elimination with the first non-zero diagonal entry
// as pivot (a Cholesky factor with zero pivots skipped). The sign of a column
// and a rotation of the columns do not change the law; square roots of
// squares are given without absolute values, which keeps the columns smooth.
func Factor(a [][]algebra.Expr) ([][]algebra.Expr, error) {
	n := len(a)
	m := make([][]algebra.Expr, n)
	for i := range a {
		m[i] = append([]algebra.Expr(nil), a[i]...)
	}
	rows := make([][]algebra.Expr, n)
	for p := 0; p < n; p++ {
		if m[p][p].IsZero() {
			continue
		}
		root, err := m[p][p].Sqrt()
		if err != nil {
			return nil, err
		}
		if root, err = root.DropAbs(); err != nil {
			return nil, err
		}
		col := make([]algebra.Expr, n)
		for i := range col {
			if i == p {
				col[i] = root
				continue
			}
			if col[i], err = m[i][p].Div(root); err != nil {
				return nil, err
			}
		}
		pivot := m[p][p]
		for i := range m {
			if i == p {
				continue
			}
			f, err := m[i][p].Div(pivot)
			if err != nil {
				return nil, err
			}
			if f.IsZero() {
				continue
			}
			for j := range m {
				if j != p {
					m[i][j] = m[i][j].Sub(f.Mul(m[p][j]))
				}
			}
		}
		for i := range m {
			m[i][p], m[p][i] = a[0][0].Ring().Int(0), a[0][0].Ring().Int(0)
		}
		for i := range rows {
			rows[i] = append(rows[i], col[i])
		}
	}
	return rows, nil
}

// StratonovichDrift converts an Ito drift: f_i - 1/2 sum_jk sigma_jk d_j
// sigma_ik.
func StratonovichDrift(drift []algebra.Expr, sigma [][]algebra.Expr, slow []string) []algebra.Expr {
	out := append([]algebra.Expr(nil), drift...)
	for i := range drift {
		half := drift[i].Ring().Frac(1, 2)
		for j, x := range slow {
			for k := range sigma[i] {
				if d := sigma[i][k].Diff(x); !d.IsZero() && !sigma[j][k].IsZero() {
					out[i] = out[i].Sub(half.Mul(sigma[j][k]).Mul(d))
				}
			}
		}
	}
	return out
}
