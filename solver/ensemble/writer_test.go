package ensemble

import (
	"archive/zip"
	"bytes"
	"encoding/binary"
	"encoding/csv"
	"io"
	"math"
	"os"
	"strconv"
	"strings"
	"testing"
)

func TestCSVReadsBackExactly(t *testing.T) {
	m, s := everything()
	r := run(t, m, s)
	var b bytes.Buffer
	if err := r.WriteCSV(&b, "model: gel crawler\n\nseed: 7"); err != nil {
		t.Fatal(err)
	}
	if !strings.HasPrefix(b.String(), "# model: gel crawler\n#\n# seed: 7\ntime,") {
		t.Errorf("header %q", b.String()[:40])
	}
	c := csv.NewReader(&b)
	c.Comment = '#'
	table, err := c.ReadAll()
	if err != nil || len(table) != 1+len(r.Times)*len(r.Observables) {
		t.Fatalf("%d rows, %v", len(table), err)
	}
	if mean, _ := strconv.ParseFloat(table[2][3], 64); mean != r.Times[0].Mean[1] || table[2][1] != "y" {
		t.Errorf("row %v, want the mean %v of y", table[2], r.Times[0].Mean[1])
	}
	b.Reset()
	h := r.Times[0].Histograms[0]
	if err := h.WriteCSV(&b, ""); err != nil {
		t.Fatal(err)
	}
	c = csv.NewReader(&b)
	c.Comment = '#'
	if table, err = c.ReadAll(); err != nil || len(table) != 1+20 || len(table[0]) != 5 {
		t.Fatalf("%d rows of %d, %v", len(table), len(table[0]), err)
	}
	// The last observable runs fastest: row 6 is cell (1, 1).
	if got := table[6]; got[0] != number(h.Edges(0)[1]) || got[2] != "0.25" || got[4] != strconv.FormatUint(h.Counts[5], 10) {
		t.Errorf("row of cell (1, 1): %v", got)
	}
}

// The archive is read here by the rules of the format; it was also read with
// NumPy once (numpy.load).
func TestNPZ(t *testing.T) {
	m, s := everything()
	r := run(t, m, s)
	write := func() []byte {
		var b bytes.Buffer
		if err := WriteNPZ(&b, `{"seed":7}`, r.Arrays()...); err != nil {
			t.Fatal(err)
		}
		return b.Bytes()
	}
	data := write()
	if !bytes.Equal(data, write()) {
		t.Error("two writes differ")
	}
	if name := os.Getenv("ENSEMBLE_TEST_NPZ"); name != "" {
		if err := os.WriteFile(name, data, 0o600); err != nil {
			t.Fatal(err)
		}
	}
	z, err := zip.NewReader(bytes.NewReader(data), int64(len(data)))
	if err != nil {
		t.Fatal(err)
	}
	found := map[string][]byte{}
	for _, f := range z.File {
		rc, err := f.Open()
		if err != nil {
			t.Fatal(err)
		}
		body, err := io.ReadAll(rc) // checks the sum
		if err != nil {
			t.Fatal(err)
		}
		n := int(binary.LittleEndian.Uint16(body[8:]))
		if string(body[:8]) != "\x93NUMPY\x01\x00" || (10+n)%64 != 0 || body[9+n] != '\n' {
			t.Errorf("%s: malformed head", f.Name)
		}
		found[f.Name] = body
		if f.Name == "mean.npy" && !strings.Contains(string(body[10:10+n]), "'shape': (2, 2)") {
			t.Errorf("head of the means: %s", body[10:10+n])
		}
	}
	mean := found["mean.npy"]
	last := math.Float64frombits(binary.LittleEndian.Uint64(mean[len(mean)-8:]))
	if last != r.Times[1].Mean[1] {
		t.Errorf("last mean %v, want %v", last, r.Times[1].Mean[1])
	}
	if !bytes.HasSuffix(found["meta.npy"], []byte(`{"seed":7}`)) {
		t.Error("no meta")
	}
	if err := WriteNPZ(io.Discard, "", Array{"bad", []int{3}, []float64{1}}); err == nil {
		t.Error("a wrong shape is not refused")
	}
}
