package volume

import (
	"fmt"
	"strings"
)

// Class is a set of cells that reach one another.
type Class struct {
	Cells     int
	First     int       // lowest cell number
	Low, High []float64 // centres of the cells at the corners of the smallest box around it
	Recurrent bool      // nothing leaves it
}

// Classes is the decomposition of the graph of M into strongly connected
// components; an edge goes from a cell to another when probability flows that
// way at a positive rate.
type Classes struct {
	Recurrent []Class // in the order of their first cells
	Transient int     // number of cells outside all recurrent classes
	Of        []int32 // Of[k]: index in Recurrent of the class of cell k, -1 for transient cells
}

// ReducibleError reports an operator without a unique stationary density.
type ReducibleError struct{ Classes *Classes }

func (e *ReducibleError) Error() string {
	var b strings.Builder
	fmt.Fprintf(&b, "%d recurrent classes, so the stationary density is not unique:", len(e.Classes.Recurrent))
	for i, c := range e.Classes.Recurrent {
		if i == 4 {
			fmt.Fprintf(&b, " and %d more", len(e.Classes.Recurrent)-i)
			break
		}
		fmt.Fprintf(&b, " %d cells within %.4g to %.4g;", c.Cells, c.Low, c.High)
	}
	return strings.TrimSuffix(b.String(), ";")
}

// successors calls visit for every cell that k sends probability to.
func (m *Operator) successors(k int, visit func(int)) {
	l := &m.Layout
	r, i := k/l.Nx, k%l.Nx
	at := l.Row(r) + i
	wrap := func(j int) int {
		if j < 0 || j >= l.Nx {
			if !l.PeriodicX {
				return -1
			}
			return (j + l.Nx) % l.Nx
		}
		return j
	}
	for li := range m.Links {
		link := &m.Links[li]
		if u := m.UpperRow(li, r); u >= 0 && link.Out[at] != 0 {
			if j := wrap(i + link.Step[0]); j >= 0 {
				visit(u*l.Nx + j)
			}
		}
		if d := m.LowerRow(li, r); d >= 0 {
			if j := wrap(i - link.Step[0]); j >= 0 && link.Back[l.Row(d)+j] != 0 {
				visit(d*l.Nx + j)
			}
		}
	}
}

// FindClasses decomposes the graph by Tarjan's algorithm (SIAM J. Comput. 1
// (1972) 146-160), without recursion. A cell that loses probability through an
// absorbing side is transient.
func FindClasses(m *Operator) *Classes {
	n := m.Grid.Cells()
	index, low := make([]int32, n), make([]int32, n)
	comp := make([]int32, n)
	for k := range comp {
		comp[k] = -1
	}
	type frame struct {
		cell int32
		next int8
		succ [8]int32
		n    int8
	}
	var work []frame
	var stack []int32
	push := func(k int32) frame {
		f := frame{cell: k}
		m.successors(int(k), func(j int) {
			if int(f.n) < len(f.succ) {
				f.succ[f.n] = int32(j)
				f.n++
			}
		})
		return f
	}
	if len(m.Links) > 4 {
		return findClassesWide(m)
	}
	var counter, comps int32
	for start := 0; start < n; start++ {
		if index[start] != 0 {
			continue
		}
		counter++
		index[start], low[start] = counter, counter
		stack = append(stack, int32(start))
		work = append(work[:0], push(int32(start)))
		for len(work) > 0 {
			f := &work[len(work)-1]
			if f.next < f.n {
				j := f.succ[f.next]
				f.next++
				if index[j] == 0 {
					counter++
					index[j], low[j] = counter, counter
					stack = append(stack, j)
					work = append(work, push(j))
				} else if comp[j] < 0 {
					low[f.cell] = min(low[f.cell], index[j])
				}
				continue
			}
			k := f.cell
			work = work[:len(work)-1]
			if len(work) > 0 {
				p := work[len(work)-1].cell
				low[p] = min(low[p], low[k])
			}
			if low[k] == index[k] {
				for {
					j := stack[len(stack)-1]
					stack = stack[:len(stack)-1]
					comp[j] = comps
					if j == k {
						break
					}
				}
				comps++
			}
		}
	}
	return m.collect(comp, int(comps))
}

// findClassesWide handles stencils with many links by two passes of
// depth-first search on explicit adjacency (Kosaraju's algorithm).
func findClassesWide(m *Operator) *Classes {
	n := m.Grid.Cells()
	forward, backward := make([][]int32, n), make([][]int32, n)
	for k := range forward {
		m.successors(k, func(j int) {
			forward[k] = append(forward[k], int32(j))
			backward[j] = append(backward[j], int32(k))
		})
	}
	var post []int32
	seen := make([]int, n)
	type frame struct {
		cell int32
		next int
	}
	for start := range forward {
		if seen[start] != 0 {
			continue
		}
		seen[start] = 1
		work := []frame{{int32(start), 0}}
		for len(work) > 0 {
			f := &work[len(work)-1]
			if f.next < len(forward[f.cell]) {
				j := forward[f.cell][f.next]
				f.next++
				if seen[j] == 0 {
					seen[j] = 1
					work = append(work, frame{j, 0})
				}
				continue
			}
			post = append(post, f.cell)
			work = work[:len(work)-1]
		}
	}
	comp := make([]int32, n)
	for k := range comp {
		comp[k] = -1
	}
	comps := 0
	for q := n - 1; q >= 0; q-- {
		if comp[post[q]] >= 0 {
			continue
		}
		comp[post[q]] = int32(comps)
		todo := []int32{post[q]}
		for len(todo) > 0 {
			k := todo[len(todo)-1]
			todo = todo[:len(todo)-1]
			for _, j := range backward[k] {
				if comp[j] < 0 {
					comp[j] = int32(comps)
					todo = append(todo, j)
				}
			}
		}
		comps++
	}
	return m.collect(comp, comps)
}

// collect turns component numbers into classes.
func (m *Operator) collect(comp []int32, comps int) *Classes {
	open := make([]bool, comps) // something leaves
	l := &m.Layout
	for k, c := range comp {
		if m.Kill != nil && m.Kill[l.Row(k/l.Nx)+k%l.Nx] != 0 {
			open[c] = true
		}
		m.successors(k, func(j int) {
			if comp[j] != c {
				open[c] = true
			}
		})
	}
	out := &Classes{Of: make([]int32, len(comp))}
	number := make([]int32, comps)
	for c := range number {
		number[c] = -1
	}
	for k, c := range comp {
		if open[c] {
			out.Of[k] = -1
			out.Transient++
			continue
		}
		x := m.Grid.CenterOf(k)
		if number[c] < 0 {
			number[c] = int32(len(out.Recurrent))
			out.Recurrent = append(out.Recurrent, Class{First: k, Low: append([]float64(nil), x...), High: append([]float64(nil), x...), Recurrent: true})
		}
		q := &out.Recurrent[number[c]]
		q.Cells++
		for d, v := range x {
			q.Low[d], q.High[d] = min(q.Low[d], v), max(q.High[d], v)
		}
		out.Of[k] = number[c]
	}
	return out
}

// SingleClass returns which cells form the only recurrent class, nil when that
// is all of them, and a *ReducibleError when there are several. The graph is
// searched only when some link carries nothing.
func SingleClass(m *Operator) ([]bool, error) {
	if m.Report.ZeroLinks == 0 && m.Kill == nil && m.Report.Monotone {
		return nil, nil
	}
	c := FindClasses(m)
	if len(c.Recurrent) != 1 {
		return nil, &ReducibleError{c}
	}
	if c.Transient == 0 {
		return nil, nil
	}
	member := make([]bool, len(c.Of))
	for k, q := range c.Of {
		member[k] = q == 0
	}
	return member, nil
}
