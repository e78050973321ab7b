package main

import "runtime"

// workers turns the option into a number of goroutines.
func workers(n int) int {
	if n <= 0 {
		return runtime.GOMAXPROCS(0)
	}
	return n
}
