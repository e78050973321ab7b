package kernel

// fastest returns the kernels for this processor.
func fastest() *vectorOps { return portable() }
