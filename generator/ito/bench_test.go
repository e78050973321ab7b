package ito

import (
	"strings"
	"testing"
)

// BenchmarkParse reads the main example: a crawler with an arbitrary speed in
// the plane, with three claims.
func BenchmarkParse(b *testing.B) {
	text := []byte(readModel(b, "b1301"))
	for b.Loop() {
		if _, err := Parse("m", text, Options{}); err != nil {
			b.Fatal(err)
		}
	}
}

// BenchmarkParseSphere reads a model whose equations are checked on the sphere.
func BenchmarkParseSphere(b *testing.B) {
	text := []byte(readModel(b, "b703"))
	for b.Loop() {
		if _, err := Parse("m", text, Options{}); err != nil {
			b.Fatal(err)
		}
	}
}

// BenchmarkParseLarge reads a model of a thousand statements.
func BenchmarkParseLarge(b *testing.B) {
	var text strings.Builder
	text.WriteString(base)
	for i := range 1000 {
		text.WriteString("let q" + itoa(i) + " = sin(k*x)^2*exp(-" + itoa(i) + "*x^2)/(1 + x^2)\n")
	}
	src := []byte(text.String())
	b.SetBytes(int64(len(src)))
	for b.Loop() {
		if _, err := Parse("m", src, Options{}); err != nil {
			b.Fatal(err)
		}
	}
}

// BenchmarkFormat lays out the main example.
func BenchmarkFormat(b *testing.B) {
	text := []byte(readModel(b, "b1301"))
	for b.Loop() {
		if _, err := Format("m", text); err != nil {
			b.Fatal(err)
		}
	}
}
