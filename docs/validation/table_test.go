package validation

// row is one line of the table of checks.
type row struct{ quantity, expected, obtained, agreement string }

func code(s string) string {
	if s == "" {
		return ""
	}
	return "`" + s + "`"
}
