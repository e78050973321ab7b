package algebra

import "errors"

// ErrInconsistent reports a linear system without a solution.
var ErrInconsistent = errors.New("the linear system has no solution")

// LinearSolution is the outcome of SolveLinear: one solution with the free
// unknowns set to zero, the free unknowns, and the pivots that were divided
// by, each non-zero as an expression but possibly zero for some values of
// the symbols.
type LinearSolution struct {
	X      []Expr
	Free   []int
	Pivots []Expr
}

// SolveLinear solves a x = b exactly over the field of expressions, by
// elimination with the shortest available pivot. Rows may outnumber unknowns.
func SolveLinear(a [][]Expr, b []Expr) (*LinearSolution, error) {
	if len(a) == 0 {
		return &LinearSolution{}, nil
	}
	n := len(a[0])
	rows := make([][]Expr, len(a))
	for i := range a {
		rows[i] = append(append([]Expr(nil), a[i]...), b[i])
	}
	usedRow := make([]bool, len(rows))
	pivotRow := make([]int, n)
	for j := range pivotRow {
		pivotRow[j] = -1
	}
	sol := &LinearSolution{}
	for step := 0; step < n; step++ {
		pi, pj := choosePivot(rows, usedRow, pivotRow, n)
		if pi < 0 {
			break
		}
		usedRow[pi], pivotRow[pj] = true, pi
		sol.Pivots = append(sol.Pivots, rows[pi][pj])
		inv := rows[pi][pj].inv()
		for i := range rows {
			if usedRow[i] || rows[i][pj].IsZero() {
				continue
			}
			f := rows[i][pj].Mul(inv)
			for k := 0; k <= n; k++ {
				if k == pj {
					rows[i][k] = rows[i][k].n.r.zero
				} else if !rows[pi][k].IsZero() {
					rows[i][k] = rows[i][k].Sub(f.Mul(rows[pi][k]))
				}
			}
		}
	}
	for i := range rows {
		if !usedRow[i] && !rows[i][n].IsZero() {
			return nil, ErrInconsistent
		}
	}
	sol.X = backSubstitute(rows, pivotRow, n, sol)
	return sol, nil
}

// choosePivot picks the shortest non-zero entry in the row with the fewest
// non-zero entries, numbers first.
func choosePivot(rows [][]Expr, usedRow []bool, pivotRow []int, n int) (int, int) {
	best, bi, bj := 0, -1, -1
	for i := range rows {
		if usedRow[i] {
			continue
		}
		nz := 0
		for j := 0; j < n; j++ {
			if pivotRow[j] < 0 && !rows[i][j].IsZero() {
				nz++
			}
		}
		for j := 0; j < n; j++ {
			if pivotRow[j] >= 0 || rows[i][j].IsZero() {
				continue
			}
			cost := nz*8 + rows[i][j].Size()*3
			if rows[i][j].isNumber() {
				cost = nz * 8
			}
			if bi < 0 || cost < best {
				best, bi, bj = cost, i, j
			}
		}
	}
	return bi, bj
}

// backSubstitute reads the unknowns off the eliminated rows. The row of a
// pivot was frozen when it was chosen, so later pivots still occur in it.
func backSubstitute(rows [][]Expr, pivotRow []int, n int, sol *LinearSolution) []Expr {
	r := rows[0][0].n.r
	x := make([]Expr, n)
	done := make([]bool, n)
	left := 0
	for j := 0; j < n; j++ {
		if pivotRow[j] < 0 {
			x[j], done[j] = r.zero, true
			sol.Free = append(sol.Free, j)
		} else {
			left++
		}
	}
	for left > 0 {
		for j := 0; j < n; j++ {
			if done[j] {
				continue
			}
			row := rows[pivotRow[j]]
			ready := true
			for k := 0; k < n; k++ {
				if k != j && !done[k] && !row[k].IsZero() {
					ready = false
					break
				}
			}
			if !ready {
				continue
			}
			v := row[n]
			for k := 0; k < n; k++ {
				if k != j && !row[k].IsZero() && !x[k].IsZero() {
					v = v.Sub(row[k].Mul(x[k]))
				}
			}
			x[j], done[j] = v.over(row[j]), true
			left--
		}
	}
	return x
}

// Determinant of a square matrix by expansion along the shortest rows for
// small sizes, else by elimination.
func Determinant(a [][]Expr) Expr {
	n := len(a)
	r := a[0][0].n.r
	if n == 1 {
		return a[0][0]
	}
	if n == 2 {
		return a[0][0].Mul(a[1][1]).Sub(a[0][1].Mul(a[1][0]))
	}
	if n > 4 {
		return determinantByElimination(a)
	}
	out := r.zero
	for j := 0; j < n; j++ {
		if a[0][j].IsZero() {
			continue
		}
		minor := make([][]Expr, 0, n-1)
		for i := 1; i < n; i++ {
			row := append(append([]Expr(nil), a[i][:j]...), a[i][j+1:]...)
			minor = append(minor, row)
		}
		t := a[0][j].Mul(Determinant(minor))
		if j%2 == 1 {
			t = t.Neg()
		}
		out = out.Add(t)
	}
	return out
}

func determinantByElimination(a [][]Expr) Expr {
	n := len(a)
	r := a[0][0].n.r
	m := make([][]Expr, n)
	for i := range a {
		m[i] = append([]Expr(nil), a[i]...)
	}
	det := r.unit
	for c := 0; c < n; c++ {
		p := -1
		for i := c; i < n; i++ {
			if !m[i][c].IsZero() && (p < 0 || m[i][c].Size() < m[p][c].Size()) {
				p = i
			}
		}
		if p < 0 {
			return r.zero
		}
		if p != c {
			m[p], m[c] = m[c], m[p]
			det = det.Neg()
		}
		det = det.Mul(m[c][c])
		inv := m[c][c].inv()
		for i := c + 1; i < n; i++ {
			if m[i][c].IsZero() {
				continue
			}
			f := m[i][c].Mul(inv)
			for k := c + 1; k < n; k++ {
				if !m[c][k].IsZero() {
					m[i][k] = m[i][k].Sub(f.Mul(m[c][k]))
				}
			}
		}
	}
	return det
}
