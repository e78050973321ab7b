package density

import (
	"archive/zip"
	"bufio"
	"encoding/binary"
	"encoding/json"
	"fmt"
	"io"
	"math"
	"strconv"
	"strings"
)

// Column is a named quantity with one value a cell, in grid order.
type Column struct {
	Name   string
	Values []float64
}

// Columns returns the density and the components of the current at the cell
// centres, and with d the closed form and the difference from it.
func (r *Result) Columns(c *Current, d *Difference) []Column {
	cols := []Column{{"p", r.P}}
	if c != nil {
		for a, v := range c.Cells {
			cols = append(cols, Column{"J_" + r.Grid.Axis(a).Name, v})
		}
	}
	if d != nil {
		cols = append(cols, Column{"p_exact", d.Exact}, Column{"p_difference", d.Map})
	}
	return cols
}

// WriteCSV writes one line a cell: the coordinates of its centre and the
// columns, with 17 significant digits. Every line of header goes in front after
// "# ". The bytes depend on the arguments only.
func WriteCSV(w io.Writer, header string, r *Result, cols []Column) error {
	b := bufio.NewWriterSize(w, 1<<16)
	writeHeader(b, header)
	dim := r.Grid.Dim()
	names := make([]string, 0, dim+len(cols))
	for d := 0; d < dim; d++ {
		names = append(names, r.Grid.Axis(d).Name)
	}
	for _, c := range cols {
		if len(c.Values) != r.Grid.Cells() {
			return fmt.Errorf("column %s has %d values for %d cells", c.Name, len(c.Values), r.Grid.Cells())
		}
		names = append(names, c.Name)
	}
	b.WriteString(strings.Join(names, ","))
	b.WriteByte('\n')
	centers := make([][]float64, dim)
	for d := range centers {
		centers[d] = r.Grid.Axis(d).Centers()
	}
	line := make([]byte, 0, 32*len(names))
	for k := 0; k < r.Grid.Cells(); k++ {
		line = line[:0]
		for d, i := range r.Grid.Coordinates(k) {
			if d > 0 {
				line = append(line, ',')
			}
			line = strconv.AppendFloat(line, centers[d][i], 'g', 17, 64)
		}
		for _, c := range cols {
			line = append(line, ',')
			line = strconv.AppendFloat(line, c.Values[k], 'g', 17, 64)
		}
		line = append(line, '\n')
		if _, err := b.Write(line); err != nil {
			return err
		}
	}
	return b.Flush()
}

func writeHeader(b *bufio.Writer, header string) {
	if header == "" {
		return
	}
	for _, line := range strings.Split(strings.TrimRight(header, "\n"), "\n") {
		b.WriteString("# ")
		b.WriteString(line)
		b.WriteByte('\n')
	}
}

// WriteNPZ writes an archive that numpy.load reads: the columns as arrays of
// shape (n_last, ..., n_first), the cell edges of every axis as edges_NAME, and
// meta, a JSON text in a zero-dimensional array of characters, which holds what
// the caller gives. No clock enters, so the same arguments give the same bytes.
func WriteNPZ(w io.Writer, meta any, r *Result, cols []Column) error {
	text, err := json.Marshal(meta)
	if err != nil {
		return fmt.Errorf("meta of the archive: %w", err)
	}
	z := zip.NewWriter(w)
	shape := r.Grid.Shape()
	for i, j := 0, len(shape)-1; i < j; i, j = i+1, j-1 {
		shape[i], shape[j] = shape[j], shape[i]
	}
	for d := 0; d < r.Grid.Dim(); d++ {
		a := r.Grid.Axis(d)
		if err := writeNPY(z, "edges_"+a.Name, []int{len(a.Edges)}, a.Edges); err != nil {
			return err
		}
	}
	for _, c := range cols {
		if len(c.Values) != r.Grid.Cells() {
			return fmt.Errorf("column %s has %d values for %d cells", c.Name, len(c.Values), r.Grid.Cells())
		}
		if err := writeNPY(z, c.Name, shape, c.Values); err != nil {
			return err
		}
	}
	if err := writeText(z, "meta", string(text)); err != nil {
		return err
	}
	return z.Close()
}

// npyHeader is the header of version 1.0 of the format, padded to a multiple of
// 64 bytes (NumPy Enhancement Proposal 1).
func npyHeader(descr, shape string) []byte {
	h := fmt.Sprintf("{'descr': '%s', 'fortran_order': False, 'shape': %s, }", descr, shape)
	pad := 63 - (10+len(h))%64
	h += strings.Repeat(" ", pad) + "\n"
	b := []byte("\x93NUMPY\x01\x00")
	b = binary.LittleEndian.AppendUint16(b, uint16(len(h)))
	return append(b, h...)
}

func writeNPY(z *zip.Writer, name string, shape []int, values []float64) error {
	f, err := z.CreateHeader(&zip.FileHeader{Name: name + ".npy", Method: zip.Deflate})
	if err != nil {
		return err
	}
	dims := make([]string, len(shape))
	for i, n := range shape {
		dims[i] = strconv.Itoa(n)
	}
	text := "(" + strings.Join(dims, ", ") + ")"
	if len(shape) == 1 {
		text = "(" + dims[0] + ",)"
	}
	b := bufio.NewWriterSize(f, 1<<16)
	b.Write(npyHeader("<f8", text))
	var word [8]byte
	for _, v := range values {
		binary.LittleEndian.PutUint64(word[:], math.Float64bits(v))
		if _, err := b.Write(word[:]); err != nil {
			return err
		}
	}
	return b.Flush()
}

// writeText stores a string as a zero-dimensional array of UTF-32 characters.
func writeText(z *zip.Writer, name, text string) error {
	f, err := z.CreateHeader(&zip.FileHeader{Name: name + ".npy", Method: zip.Deflate})
	if err != nil {
		return err
	}
	runes := []rune(text)
	b := bufio.NewWriter(f)
	b.Write(npyHeader("<U"+strconv.Itoa(max(1, len(runes))), "()"))
	var word [4]byte
	if len(runes) == 0 {
		runes = []rune{0}
	}
	for _, c := range runes {
		binary.LittleEndian.PutUint32(word[:], uint32(c))
		if _, err := b.Write(word[:]); err != nil {
			return err
		}
	}
	return b.Flush()
}
