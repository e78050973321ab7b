package volume

func (a *assembly) assembleFull() error { panic("todo") }
