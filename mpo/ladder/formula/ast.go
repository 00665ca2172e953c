package formula

// Node is a part of a formula: one of *Number, *Name, *Indexed, *Dot, *Unary, *Binary, *Call, *Fold, *Conj in any
// formula, and *Compare, *Logic, *Not in conditions.
type Node interface {
	// Pos is the byte offset in the source that an error about this node points at: the operator's sign for
	// Binary, Conj, Compare and Logic, the first byte for all else.
	Pos() int
	node()
}

// Number is a real literal, never negative: a sign is a Unary.
type Number struct {
	At    int
	Value float64
}

// Name is a name without brackets: a constant, an index, a leg, or one of i, pi, j, rungs.
type Name struct {
	At    int
	Ident string
}

// Indexed is a name with brackets: an operator "b^+[a,j]" or a profile "h[a,j]".
type Indexed struct {
	At    int
	Name  string // "b", "c_up", "S"
	Super string // "", "+", "-", "x", "y" or "z"
	// Indices holds at least one expression; conjugates, comparisons and indexed names cannot occur inside.
	Indices []Node
}

// Symbol is the name as written before the bracket: "b^+", "S^z", "n".
func (n *Indexed) Symbol() string {
	if n.Super == "" {
		return n.Name
	}
	return n.Name + "^" + n.Super
}

// Dot is a scalar product of two vectors of operators: "S[a,j].S[b,j]". Neither carries a superscript.
type Dot struct {
	At   int // of A
	A, B *Indexed
}

// Unary is a minus sign before X.
type Unary struct {
	At int
	X  Node
}

// Binary is X Op Y with Op one of '+', '-', '*', '/', '%', '^'. Implicit marks a product written without a sign; At is then where Y
// begins.
type Binary struct {
	At       int
	Op       byte
	Implicit bool
	X, Y     Node
}

// Call is a function of Functions with the right number of arguments.
type Call struct {
	At   int
	Name string
	Args []Node
}

// Fold is sum(Var=From..To, Body) or prod(Var=From..To, Body), both ends included, the factors of a product in rising order.
type Fold struct {
	At       int
	Product  bool
	Var      string
	VarAt    int
	From, To Node // cannot hold conjugates, comparisons or indexed names
	Body     Node
}

// Conj is "X + h.c." or, with Minus, "X - h.c.": X plus or minus its Hermitian conjugate.
type Conj struct {
	At    int
	Minus bool
	X     Node
}

// Compare is X Op Y with Op one of "==", "!=", "<", "<=", ">", ">=".
type Compare struct {
	At   int
	Op   string
	X, Y Node // numbers or names of legs
}

// Logic is X and Y or, with Or, X or Y. Both are Compare, Logic or Not.
type Logic struct {
	At   int
	Or   bool
	X, Y Node
}

// Not denies X, which is Compare, Logic or Not.
type Not struct {
	At int
	X  Node
}

func (n *Number) Pos() int  { return n.At }
func (n *Name) Pos() int    { return n.At }
func (n *Indexed) Pos() int { return n.At }
func (n *Dot) Pos() int     { return n.At }
func (n *Unary) Pos() int   { return n.At }
func (n *Binary) Pos() int  { return n.At }
func (n *Call) Pos() int    { return n.At }
func (n *Fold) Pos() int    { return n.At }
func (n *Conj) Pos() int    { return n.At }
func (n *Compare) Pos() int { return n.At }
func (n *Logic) Pos() int   { return n.At }
func (n *Not) Pos() int     { return n.At }

func (*Number) node()  {}
func (*Name) node()    {}
func (*Indexed) node() {}
func (*Dot) node()     {}
func (*Unary) node()   {}
func (*Binary) node()  {}
func (*Call) node()    {}
func (*Fold) node()    {}
func (*Conj) node()    {}
func (*Compare) node() {}
func (*Logic) node()   {}
func (*Not) node()     {}

// Walk calls visit for n and, where visit returns true, for the nodes below it, from left to right.
func Walk(n Node, visit func(Node) bool) {
	if !visit(n) {
		return
	}
	for _, c := range children(n) {
		Walk(c, visit)
	}
}

func children(n Node) []Node {
	switch n := n.(type) {
	case *Indexed:
		return n.Indices
	case *Dot:
		return []Node{n.A, n.B}
	case *Unary:
		return []Node{n.X}
	case *Binary:
		return []Node{n.X, n.Y}
	case *Call:
		return n.Args
	case *Fold:
		return []Node{n.From, n.To, n.Body}
	case *Conj:
		return []Node{n.X}
	case *Compare:
		return []Node{n.X, n.Y}
	case *Logic:
		return []Node{n.X, n.Y}
	case *Not:
		return []Node{n.X}
	}
	return nil
}
