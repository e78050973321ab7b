// Package validation holds the checks of the whole program against values from
// outside it: reference cases with independently computed limits (the folder
// cases, with the models in generator/ito/testdata/models), published results,
// and the shipped examples. It has no code of its own, only tests.
//
// The table docs/validation.md is written by
//
//	go test ./docs/validation -update
//
// and a test without the flag fails when the table is not what the program
// finds.
package validation
