//go:build !linux

package volume

import "unsafe"

func adviseHuge(unsafe.Pointer, int) {}
