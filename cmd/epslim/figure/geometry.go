package figure

import "math"

// clipLine cuts a polyline at the sides of a rectangle (Liang and Barsky's method, one segment at a
// time) and returns the pieces inside.
func clipLine(line []point, r rect) [][]point {
	var out [][]point
	var cur []point
	flush := func() {
		if len(cur) > 1 {
			out = append(out, cur)
		}
		cur = nil
	}
	for i := 1; i < len(line); i++ {
		a, b, ok := clipSegment(line[i-1], line[i], r)
		if !ok {
			flush()
			continue
		}
		if len(cur) == 0 || cur[len(cur)-1] != a {
			flush()
			cur = append(cur, a)
		}
		cur = append(cur, b)
		if b != line[i] {
			flush()
		}
	}
	flush()
	return out
}

func clipSegment(a, b point, r rect) (point, point, bool) {
	d := b.sub(a)
	lo, hi := 0.0, 1.0
	for _, s := range [4][2]float64{
		{-d.x, a.x - r.left}, {d.x, r.right - a.x}, {-d.y, a.y - r.top}, {d.y, r.bottom - a.y},
	} {
		p, q := s[0], s[1]
		switch {
		case p == 0 && q < 0:
			return a, b, false
		case p < 0:
			lo = math.Max(lo, q/p)
		case p > 0:
			hi = math.Min(hi, q/p)
		}
	}
	if lo > hi {
		return a, b, false
	}
	from, to := a, b
	if lo > 0 {
		from = a.add(d.times(lo))
	}
	if hi < 1 {
		to = a.add(d.times(hi))
	}
	return from, to, true
}

// clipPolygon cuts a polygon at the sides of a rectangle (Sutherland and Hodgman's method).
func clipPolygon(poly []point, r rect) []point {
	sides := []struct {
		inside func(point) bool
		cut    func(a, b point) point
	}{
		{func(p point) bool { return p.x >= r.left }, func(a, b point) point { return cutX(a, b, r.left) }},
		{func(p point) bool { return p.x <= r.right }, func(a, b point) point { return cutX(a, b, r.right) }},
		{func(p point) bool { return p.y >= r.top }, func(a, b point) point { return cutY(a, b, r.top) }},
		{func(p point) bool { return p.y <= r.bottom }, func(a, b point) point { return cutY(a, b, r.bottom) }},
	}
	for _, s := range sides {
		var next []point
		for i, b := range poly {
			a := poly[(i+len(poly)-1)%len(poly)]
			in, was := s.inside(b), s.inside(a)
			if in != was {
				next = append(next, s.cut(a, b))
			}
			if in {
				next = append(next, b)
			}
		}
		poly = next
	}
	if len(poly) < 3 {
		return nil
	}
	return poly
}

func cutX(a, b point, x float64) point {
	return point{x, a.y + (b.y-a.y)*(x-a.x)/(b.x-a.x)}
}

func cutY(a, b point, y float64) point {
	return point{a.x + (b.x-a.x)*(y-a.y)/(b.y-a.y), y}
}

// simplify drops points that lie within tol of the line through the ones that are kept (Ramer,
// Douglas and Peucker's method, with an explicit stack). The ends are kept.
func simplify(line []point, tol float64) []point {
	if len(line) < 3 {
		return line
	}
	keep := make([]bool, len(line))
	keep[0], keep[len(line)-1] = true, true
	stack := [][2]int{{0, len(line) - 1}}
	for len(stack) > 0 {
		s := stack[len(stack)-1]
		stack = stack[:len(stack)-1]
		far, at := tol, -1
		for i := s[0] + 1; i < s[1]; i++ {
			if d := distanceToSegment(line[i], line[s[0]], line[s[1]]); d > far {
				far, at = d, i
			}
		}
		if at > 0 {
			keep[at] = true
			stack = append(stack, [2]int{s[0], at}, [2]int{at, s[1]})
		}
	}
	var out []point
	for i, k := range keep {
		if k {
			out = append(out, line[i])
		}
	}
	return out
}

func distanceToSegment(p, a, b point) float64 {
	d := b.sub(a)
	n := d.x*d.x + d.y*d.y
	if n == 0 {
		return p.sub(a).norm()
	}
	t := math.Max(0, math.Min(1, (p.sub(a).x*d.x+p.sub(a).y*d.y)/n))
	return p.sub(a.add(d.times(t))).norm()
}

// strokePolygons gives the area covered by a line as polygons that all turn the same way, so that
// their union is what a non-zero winding rule fills. Joins are round, ends are cut square.
func strokePolygons(lines [][]point, closed bool, width float64, dash []float64) [][]point {
	var out [][]point
	h := width / 2
	for _, l := range lines {
		if closed && len(l) > 1 {
			l = append(append([]point{}, l...), l[0], l[1])
		}
		for _, d := range dashes(l, dash) {
			for i := 1; i < len(d); i++ {
				a, b := d[i-1], d[i]
				v := b.sub(a)
				n := v.norm()
				if n == 0 {
					continue
				}
				u := point{-v.y / n * h, v.x / n * h}
				out = append(out, []point{a.add(u), a.sub(u), b.sub(u), b.add(u)})
				if i+1 < len(d) && turns(v, d[i+1].sub(b)) {
					out = append(out, disc(b, h))
				}
			}
		}
	}
	return out
}

// turns tells whether the join of two segments leaves a visible notch.
func turns(v, w point) bool {
	return math.Abs(v.cross(w)) > 0.02*v.norm()*w.norm() || v.x*w.x+v.y*w.y < 0
}

// disc is a circle as a polygon that turns the same way as the quadrilaterals of strokePolygons.
func disc(c point, r float64) []point {
	const n = 20
	p := make([]point, n)
	for i := range p {
		s, co := math.Sincos(2 * math.Pi * float64(i) / n)
		p[i] = point{c.x + r*co, c.y + r*s}
	}
	return p
}

// dashes cuts a line into the pieces that carry ink.
func dashes(l []point, dash []float64) [][]point {
	if len(dash) == 0 {
		return [][]point{l}
	}
	var out [][]point
	var cur []point
	k, left, on := 0, dash[0], true
	if len(l) > 0 {
		cur = []point{l[0]}
	}
	for i := 1; i < len(l); i++ {
		a, b := l[i-1], l[i]
		n := b.sub(a).norm()
		for done := 0.0; done < n; {
			step := math.Min(left, n-done)
			done += step
			left -= step
			p := b
			if done < n {
				p = a.add(b.sub(a).times(done / n))
			}
			if on {
				cur = append(cur, p)
			}
			if left <= 0 {
				if on {
					out = append(out, cur)
				}
				k = (k + 1) % len(dash)
				left, on, cur = dash[k], !on, []point{p}
			}
		}
	}
	if on && len(cur) > 1 {
		out = append(out, cur)
	}
	return out
}
