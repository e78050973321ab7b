package ito

import "epslim/generator/ito/syntax"

// Outline is the declared names of a model file, as far as it can be read: it
// serves the completion of options while a model is still being written.
type Outline struct {
	Title      string
	Slow, Fast []string
	Parameters []string
	Functions  []string // with their arguments, such as v(x, y)
}

// ReadOutline returns the names that a model file declares, whatever errors it
// has.
func ReadOutline(src []byte) Outline {
	var o Outline
	file, _ := syntax.Parse("", src, Limits{})
	if file == nil {
		return o
	}
	for _, st := range file.Statements {
		switch st := st.(type) {
		case *syntax.Title:
			o.Title = st.Text
		case *syntax.Variable:
			for _, n := range st.Names {
				if st.Slow {
					o.Slow = append(o.Slow, n.Name)
				} else {
					o.Fast = append(o.Fast, n.Name)
				}
			}
		case *syntax.Param:
			o.Parameters = append(o.Parameters, st.Name.Name)
		case *syntax.Function:
			var args []string
			for _, a := range st.Args {
				args = append(args, a.Name)
			}
			o.Functions = append(o.Functions, syntaxOf(st.Name.Name, args))
		}
	}
	return o
}
