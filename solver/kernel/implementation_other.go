//go:build !amd64

package kernel

func accelerated() []*vectorOps { return nil }
