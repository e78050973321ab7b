package ensemble

import (
	"archive/zip"
	"bufio"
	"encoding/binary"
	"fmt"
	"hash/crc32"
	"io"
	"math"
	"strconv"
	"strings"
	"time"
)

// WriteCSV writes the moments at all times: one row for each time and observable
// with the columns time, observable, n, mean, stderr, variance, m2. header is the
// provenance given by the caller; each of its lines is preceded by "# ".
func (r *Result) WriteCSV(w io.Writer, header string) error {
	b := bufio.NewWriter(w)
	writeHeader(b, header)
	b.WriteString("time,observable,n,mean,stderr,variance,m2\n")
	for _, t := range r.Times {
		for i, name := range r.Observables {
			fmt.Fprintf(b, "%s,%s,%d,%s,%s,%s,%s\n", number(t.Time), quote(name), t.N, number(t.Mean[i]), number(t.StdErr[i]), number(t.Variance(i)), number(t.M2[i][i]))
		}
	}
	return b.Flush()
}

// WriteCSV writes the counts: one row for each cell with its ends along each
// axis and its count.
func (h *Histogram) WriteCSV(w io.Writer, header string) error {
	b := bufio.NewWriter(w)
	writeHeader(b, header)
	fmt.Fprintf(b, "# outside,%d\n", h.Outside)
	var names []string
	var edges [][]float64
	for axis, name := range h.Spec.Observables {
		names = append(names, quote(name+" from"), quote(name+" to"))
		edges = append(edges, h.Edges(axis))
	}
	fmt.Fprintf(b, "%s,count\n", strings.Join(names, ","))
	for cell, count := range h.Counts {
		rest := cell
		row := make([]string, 2*len(edges))
		for axis := len(edges) - 1; axis >= 0; axis-- {
			i := rest % h.Spec.Cells[axis]
			rest /= h.Spec.Cells[axis]
			row[2*axis], row[2*axis+1] = number(edges[axis][i]), number(edges[axis][i+1])
		}
		fmt.Fprintf(b, "%s,%d\n", strings.Join(row, ","), count)
	}
	return b.Flush()
}

// WriteCSV writes the differences from the limit and the rates: one row for each
// observable and eps.
func (c *Convergence) WriteCSV(w io.Writer, header string) error {
	b := bufio.NewWriter(w)
	writeHeader(b, header)
	b.WriteString("observable,eps,difference,stderr,rate,rate_lower,rate_upper,rate_status\n")
	for i, name := range c.Limit.Observables {
		for _, p := range c.Points[i] {
			q := c.Rates[i]
			fmt.Fprintf(b, "%s,%s,%s,%s,%s,%s,%s,%s\n", quote(name), number(p.Eps), number(p.Value), number(p.StdErr), number(q.Exponent), number(q.Lower), number(q.Upper), q.Status)
		}
	}
	return b.Flush()
}

func writeHeader(b *bufio.Writer, header string) {
	if header == "" {
		return
	}
	for _, line := range strings.Split(strings.TrimRight(header, "\n"), "\n") {
		b.WriteString(strings.TrimRight("# "+line, " ") + "\n")
	}
}

// number writes a float64 with the fewest digits that read back as it; NaN is empty.
func number(x float64) string {
	if math.IsNaN(x) {
		return ""
	}
	return strconv.FormatFloat(x, 'g', -1, 64)
}

func quote(s string) string {
	if strings.ContainsAny(s, ",\"\n") {
		return `"` + strings.ReplaceAll(s, `"`, `""`) + `"`
	}
	return s
}

// Array is one array of an NPZ file, in row-major order.
type Array struct {
	Name  string
	Shape []int
	Data  []float64
}

// WriteNPZ writes arrays as a NumPy archive (NumPy enhancement proposal 1,
// version 1.0 of the format), with meta as the array of bytes "meta". Files are
// stored without compression and without clock, so equal contents are equal bytes.
func WriteNPZ(w io.Writer, meta string, arrays ...Array) error {
	z := zip.NewWriter(w)
	for _, a := range arrays {
		n := 1
		for _, k := range a.Shape {
			n *= k
		}
		if n != len(a.Data) {
			return fmt.Errorf("ensemble: array %q has %d values for the shape %v", a.Name, len(a.Data), a.Shape)
		}
		data := make([]byte, 0, 8*n)
		for _, x := range a.Data {
			data = binary.LittleEndian.AppendUint64(data, math.Float64bits(x))
		}
		if err := writeNPY(z, a.Name, "<f8", a.Shape, data); err != nil {
			return err
		}
	}
	if err := writeNPY(z, "meta", "|u1", []int{len(meta)}, []byte(meta)); err != nil {
		return err
	}
	return z.Close()
}

func writeNPY(z *zip.Writer, name, dtype string, shape []int, data []byte) error {
	dims := make([]string, len(shape))
	for i, k := range shape {
		dims[i] = strconv.Itoa(k)
	}
	tuple := strings.Join(dims, ", ")
	if len(shape) == 1 {
		tuple += ","
	}
	head := fmt.Sprintf("{'descr': '%s', 'fortran_order': False, 'shape': (%s), }", dtype, tuple)
	head += strings.Repeat(" ", (64-(10+len(head)+1)%64)%64) + "\n"
	body := append([]byte("\x93NUMPY\x01\x00"), byte(len(head)), byte(len(head)>>8))
	body = append(append(body, head...), data...)
	h := &zip.FileHeader{Name: name + ".npy", Method: zip.Store, CRC32: crc32.ChecksumIEEE(body),
		CompressedSize64: uint64(len(body)), UncompressedSize64: uint64(len(body))}
	h.Modified = time.Time{}
	f, err := z.CreateRaw(h)
	if err != nil {
		return fmt.Errorf("ensemble: %w", err)
	}
	_, err = f.Write(body)
	return err
}

// Arrays returns the moments and histograms for WriteNPZ: times, n, mean, stderr
// (times x observables), covariance (times x observables x observables) and for
// each histogram k counts_k, outside_k and edges_k_axis.
func (r *Result) Arrays() []Array {
	t, k := len(r.Times), len(r.Observables)
	times, n := Array{"times", []int{t}, nil}, Array{"n", []int{t}, nil}
	mean, stderr := Array{"mean", []int{t, k}, nil}, Array{"stderr", []int{t, k}, nil}
	cov := Array{"covariance", []int{t, k, k}, nil}
	for _, x := range r.Times {
		times.Data = append(times.Data, x.Time)
		n.Data = append(n.Data, float64(x.N))
		mean.Data = append(mean.Data, x.Mean...)
		stderr.Data = append(stderr.Data, x.StdErr...)
		for _, row := range x.Covariance {
			cov.Data = append(cov.Data, row...)
		}
	}
	list := []Array{times, n, mean, stderr, cov}
	for i := range r.Times[0].Histograms {
		spec := r.Times[0].Histograms[i].Spec
		counts := Array{Name: fmt.Sprintf("counts_%d", i), Shape: append([]int{t}, spec.Cells...)}
		outside := Array{Name: fmt.Sprintf("outside_%d", i), Shape: []int{t}}
		for _, x := range r.Times {
			for _, c := range x.Histograms[i].Counts {
				counts.Data = append(counts.Data, float64(c))
			}
			outside.Data = append(outside.Data, float64(x.Histograms[i].Outside))
		}
		list = append(list, counts, outside)
		for axis := range spec.Cells {
			e := r.Times[0].Histograms[i].Edges(axis)
			list = append(list, Array{fmt.Sprintf("edges_%d_%d", i, axis), []int{len(e)}, e})
		}
	}
	return list
}
