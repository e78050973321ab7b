package volume

import (
	"unsafe"

	"golang.org/x/sys/unix"
)

// adviseHuge asks for large pages under a vector that was just allocated:
// touching it for the first time then takes 512 times fewer page faults. It is
// advice only; nothing depends on whether it is followed.
func adviseHuge(p unsafe.Pointer, bytes int) {
	start := (uintptr(p) + hugePage - 1) &^ (hugePage - 1)
	end := (uintptr(p) + uintptr(bytes)) &^ (hugePage - 1)
	if end <= start {
		return
	}
	skip := start - uintptr(p)
	region := unsafe.Slice((*byte)(unsafe.Add(p, skip)), end-start)
	_ = unix.Madvise(region, unix.MADV_HUGEPAGE)
}
