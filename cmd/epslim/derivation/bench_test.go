package derivation

import (
	"context"
	"testing"

	"epslim/generator/ito"
)

// The models whose whole derivation is timed.
const (
	mover = `title "Gel crawler"
slow x in [0, 1] periodic
slow y in [0, 1] periodic
fast theta on circle
param D = 0.8 positive
function v(x, y) positive
dx = v*cos(theta)/eps dt
dy = v*sin(theta)/eps dt
dtheta = sqrt(2*D)/eps dW1
`
	six = `slow x1 on line
slow y1 on line
slow x2 on line
slow y2 on line
slow x3 on line
slow y3 on line
fast phi on circle
param D positive
function v1(x1, y1, x2, y2, x3, y3) positive
function v2(x1, y1, x2, y2, x3, y3) positive
function v3(x1, y1, x2, y2, x3, y3) positive
dx1 = v1*cos(phi)/eps dt
dy1 = v1*sin(phi)/eps dt
dx2 = v2*cos(2*phi)/eps dt
dy2 = v2*sin(2*phi)/eps dt
dx3 = v3*cos(3*phi)/eps dt
dy3 = v3*sin(3*phi)/eps dt
dphi = sqrt(2*D)/eps dW1
`
	chain = `slow x on line
fast y1 on line
fast y2 on line
fast y3 on line
fast y4 on line
param a positive
param b positive
param c positive
param d positive
param p
param q
param s positive
function g(x)
dx = g*(y1*y4 + y2*y3 - p*s^2*(q*c*(b + c + 2*d)*(a + b + c + d) + (p^2*(a*b + a*c + a*d + b*c + b*d + c^2 + c*d + d^2) + d*(a + d)*(b + d)*(c + d)))/(2*c*d*(a + d)*(b + c)*(b + d)*(c + d)))/eps dt
dy1 = (-a*y1 + p*y2 + q*y3)/eps^2 dt + s/eps dW1
dy2 = (-b*y2 + p*y3 + q*y4)/eps^2 dt + s/eps dW2
dy3 = (-c*y3 + p*y4)/eps^2 dt + s/eps dW3
dy4 = -d*y4/eps^2 dt + s/eps dW4
`
)

func BenchmarkDerive(b *testing.B) {
	for _, m := range []struct{ name, text string }{{"mover", mover}, {"six", six}, {"four", chain}} {
		b.Run(m.name, func(b *testing.B) {
			for b.Loop() {
				sys, err := ito.Parse(m.name, []byte(m.text), ito.Options{})
				if err != nil {
					b.Fatal(err)
				}
				res, err := Run(context.Background(), sys, Options{})
				if err != nil {
					b.Fatal(err)
				}
				if res.Refused != nil {
					b.Fatal(res.Refused)
				}
			}
		})
	}
}
