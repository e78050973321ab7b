package ito_test

import (
	"fmt"

	"epslim/generator/ito"
)

func ExampleParse() {
	s, err := ito.Parse("crawler.ito", []byte(`
title "Gel crawler"
slow x in [0, 1] periodic
fast theta on circle
param D = 0.8 positive
function v(x) positive
dx     = v*cos(theta)/eps dt
dtheta = sqrt(2*D)/eps dW1
claim drift x = v*diff(v, x)/(2*D)
`), ito.Options{Set: []string{"D=1.5", "v=1 + x^2"}})
	if err != nil {
		fmt.Println(err)
		return
	}
	fmt.Println(s.Title, s.Noises, s.Parameter("D").Value)
	for _, c := range s.Claims {
		fmt.Println(c.Label(), "=", c.Right)
	}
	// Output:
	// Gel crawler [W1] 3/2
	// drift x = v*diff(v, x)/(2*D)
}

func ExampleParse_errors() {
	_, err := ito.Parse("crawler.ito", []byte(`
slow x in [0, 1] periodic
fast theta on cricle
param D = 0.8 positive
dx     = cos(thta)/eps dt
dtheta = sqrt(2*D)/eps
`), ito.Options{})
	fmt.Println(err)
	// Output:
	// crawler.ito:3:15: "cricle" is no domain [unknown-word]
	//     fast theta on cricle
	//                   ^^^^^^
	//     expected line, halfline or circle
	//     did you mean "circle"?
	// crawler.ito:5:14: the name "thta" is not declared [undeclared-name]
	//     dx     = cos(thta)/eps dt
	//                  ^^^^
	//     did you mean "theta"?
	// crawler.ito:6:10: the term sqrt(2*D)/eps has no differential [no-differential]
	//     dtheta = sqrt(2*D)/eps
	//              ^^^^^^^^^^^^^
	//     expected dt or a Wiener increment after it; a sum before a differential stands in parentheses
}

func ExampleFormat() {
	text, err := ito.Format("m.ito", []byte("slow x in[0,1]periodic # along\nfast y\n\n\ndx=y/eps dt\ndy=-2*y/eps^2 dt+1/eps dW1"))
	fmt.Println(string(text), err)
	// Output:
	// slow x in [0, 1] periodic  # along
	// fast y
	//
	// dx = y/eps dt
	// dy = -2*y/eps^2 dt + 1/eps dW1
	//  <nil>
}
