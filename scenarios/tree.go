package scenarios

// Tree is a TOML file that knows the line of every key, for the readers of
// files that stand beside scenarios, so that their errors name the line too.
type Tree struct{ doc *document }

// ParseTree reads TOML text. file names it in errors, which are *Error.
func ParseTree(file string, text []byte) (*Tree, error) {
	doc, err := parse(file, text)
	if err != nil {
		return nil, err
	}
	return &Tree{doc}, nil
}

// ReadTree reads a TOML file, no more of it than shows that it is none.
func ReadTree(file string) (*Tree, error) {
	text, err := readFile(file)
	if err != nil {
		return nil, err
	}
	return ParseTree(file, text)
}

// Root is the whole file as a table.
func (t *Tree) Root() map[string]any { return t.doc.tree }

// ErrorAt places an error at the line of a key, "lane.configured.delay", or of
// the nearest table around it.
func (t *Tree) ErrorAt(path string, err error) error { return t.doc.errorAt(path, err) }
