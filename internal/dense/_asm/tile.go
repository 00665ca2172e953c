package main

import (
	"fmt"

	. "github.com/mmcloughlin/avo/operand"
	"github.com/mmcloughlin/avo/reg"
)

// tile is a product kernel in the making: up to maxRows rows by nv vectors of C in registers. The rows of A are read by broadcast at
// any strides. A complex row has two sums, one for the real and one for the imaginary part of A, and is otherwise like two real rows.
type tile struct {
	*generator
	isa
	complex bool
	nv      int
	partial bool // the last vector is cut

	a, b, c, row, row3, col, rowB, rowC, blocks reg.GPVirtual
	tailAt                                      reg.GPVirtual // AVX2, real: where the mask of the last vector is

	// sums per set, temporaries behind them
	temps []reg.VecPhysical
}

// maskK holds the lanes of the last vector (AVX-512).
var maskK = reg.K1

func (g *generator) tiles(s isa, complex bool, maxRows, nv int) {
	kind := "Real"
	if complex {
		kind = "Complex"
	}
	g.begin(fmt.Sprintf("tile%s%sx%d", kind, s.name, nv))
	g.args = g.Dereference(g.Param("p"))
	t := &tile{generator: g, isa: s, complex: complex, nv: nv}
	t.a, t.c = g.load("a"), g.load("c")
	t.row, t.col, t.rowB, t.rowC = g.load("rowA"), g.load("colA"), g.load("rowB"), g.load("rowC")
	t.row3 = g.GP64()
	g.LEAQ(Mem{Base: t.row, Index: t.row, Scale: 2}, t.row3)
	t.b = g.GP64()
	left := g.load("rest")
	g.MOVQ(left, g.field("left"))
	rows := g.load("rows")
	t.blocks = g.load("blocks")

	variants := []bool{true}
	if s.bytes == 64 {
		t.setMask()
	} else {
		// A cut vector costs extra instructions without mask registers: a second set of loops keeps them out of the first.
		variants = []bool{false, true}
		tail := g.load("tail")
		if !complex {
			t.tailAt = g.tailAddress(tail)
		}
		g.CMPQ(tail, Imm(uint64(t.perVector())))
		g.JNE(LabelRef("cut"))
	}
	for i, partial := range variants {
		t.partial = partial
		prefix := ""
		if i > 0 {
			prefix = "cut"
			g.Label("cut")
		}
		for m := maxRows; m > 1; m-- {
			g.CMPQ(rows, Imm(uint64(m)))
			g.JEQ(LabelRef(fmt.Sprintf("%srows%d", prefix, m)))
		}
		g.JMP(LabelRef(prefix + "rows1"))
		for m := maxRows; m >= 1; m-- {
			t.blockLoop(m, fmt.Sprintf("%srows%d", prefix, m))
			if m > 1 {
				g.MOVQ(g.field("left"), t.blocks)
				g.MOVQ(U32(0), g.field("left"))
				g.TESTQ(t.blocks, t.blocks)
				g.JEQ(LabelRef("done"))
			} else if i < len(variants)-1 {
				g.JMP(LabelRef("done"))
			}
		}
	}
	g.Label("done")
	g.VZEROUPPER()
	g.RET()
}

// perVector is the number of elements in a vector.
func (t *tile) perVector() int {
	if t.complex {
		return t.lanes() / 2
	}
	return t.lanes()
}

// setMask fills the mask register from tail.
func (t *tile) setMask() {
	tail, bits := t.load("tail"), t.GP64()
	if t.complex {
		t.ADDQ(tail, tail)
	}
	t.MOVQ(I32(-1), bits)
	t.BZHIQ(tail, bits, bits)
	t.KMOVB(bits.As32(), maskK)
}

// element is the place of A's element in row r of the block, column a.
func (t *tile) element(a, a3 reg.Register, r int) Mem {
	switch r {
	case 0:
		return Mem{Base: a}
	case 1, 2, 4:
		return Mem{Base: a, Index: t.row, Scale: uint8(r)}
	case 3:
		if a3 == nil {
			return Mem{Base: a, Index: t.row3, Scale: 1}
		}
		return Mem{Base: a3}
	case 5:
		return Mem{Base: a3, Index: t.row, Scale: 2}
	case 6:
		return Mem{Base: a3, Index: t.row3, Scale: 1}
	case 7:
		return Mem{Base: a3, Index: t.row, Scale: 4}
	}
	panic("too many rows")
}

// blockLoop runs over the blocks of that many rows.
func (t *tile) blockLoop(rows int, label string) {
	lines := rows // of sums
	if t.complex {
		lines *= 2
	}
	// Two products a cycle that take four cycles each want eight independent sums.
	sets := 1
	for sets < 4 && lines*t.nv*sets < 8 && (2*sets*lines*t.nv <= 8 || len(t.regs) == 32) {
		sets *= 2
	}
	sum := func(set, line, v int) reg.VecPhysical { return t.regs[(set*lines+line)*t.nv+v] }
	t.temps = t.regs[sets*lines*t.nv:]

	t.Label(label)
	t.prefetch(rows)
	for i := range sets * lines * t.nv {
		if r := t.regs[i]; t.bytes == 64 && i >= 16 {
			t.VPXORQ(r, r, r)
		} else {
			x := r.AsX()
			t.VXORPD(x, x, x)
		}
	}
	a := t.GP64()
	t.MOVQ(t.a, a)
	var a3 reg.Register
	if rows > 4 {
		r := t.GP64()
		t.LEAQ(Mem{Base: a, Index: t.row3, Scale: 1}, r)
		a3 = r
	}
	t.MOVQ(t.field("b"), t.b)
	k := t.load("k")
	step := func(set int) {
		t.step(rows, set, a, a3, sum)
		t.ADDQ(t.rowB, t.b)
		t.ADDQ(t.col, a)
		if a3 != nil {
			t.ADDQ(t.col, a3)
		}
	}
	if sets > 1 {
		shift := uint64(sets / 2) // 2 -> 1, 4 -> 2
		rest := label + "odd"
		t.SHRQ(Imm(shift), k)
		t.JEQ(LabelRef(rest))
		t.Label(label + "k")
		for s := range sets {
			step(s)
		}
		t.DECQ(k)
		t.JNE(LabelRef(label + "k"))
		t.Label(rest)
		t.MOVQ(t.field("k"), k)
		t.ANDQ(Imm(uint64(sets-1)), k)
		t.JEQ(LabelRef(label + "sum"))
		t.Label(label + "one")
		step(0)
		t.DECQ(k)
		t.JNE(LabelRef(label + "one"))
		t.Label(label + "sum")
		for s := sets / 2; s >= 1; s /= 2 {
			for q := range s {
				for line := range lines {
					for v := range t.nv {
						t.VADDPD(sum(q+s, line, v), sum(q, line, v), sum(q, line, v))
					}
				}
			}
		}
	} else {
		t.Label(label + "k")
		step(0)
		t.DECQ(k)
		t.JNE(LabelRef(label + "k"))
	}
	t.temps = t.regs[lines*t.nv:]
	t.store(rows, label, func(line, v int) reg.VecPhysical { return sum(0, line, v) })

	advance := t.GP64()
	t.IMUL3Q(Imm(uint64(rows)), t.row, advance)
	t.ADDQ(advance, t.a)
	t.DECQ(t.blocks)
	t.JNE(LabelRef(label))
}

// prefetch asks for the rows of C, which are needed after the loop.
func (t *tile) prefetch(rows int) {
	c := t.GP64()
	t.MOVQ(t.c, c)
	for r := range rows {
		for at := 0; at < t.nv*t.bytes; at += 64 {
			t.PREFETCHT0(Mem{Base: c, Disp: at})
		}
		if r < rows-1 {
			t.ADDQ(t.rowC, c)
		}
	}
}

// step adds the products of one column of A and one row of B.
func (t *tile) step(rows, set int, a, a3 reg.Register, sum func(set, line, v int) reg.VecPhysical) {
	b, casts := t.temps[:t.nv], t.temps[t.nv:]
	for v := range t.nv {
		t.loadB(v, b[v], casts[0])
	}
	parts := 1
	if t.complex {
		parts = 2
	}
	next := 0
	for r := range rows {
		for part := range parts {
			at := t.element(a, a3, r)
			at.Disp += 8 * part
			line := r*parts + part
			if t.bytes == 64 && t.nv == 1 {
				t.VFMADD231PD_BCST(at, b[0], sum(set, line, 0))
				continue
			}
			cast := casts[next%min(4, len(casts))]
			next++
			t.VBROADCASTSD(at, cast)
			for v := range t.nv {
				t.VFMADD231PD(cast, b[v], sum(set, line, v))
			}
		}
	}
}

// loadB loads vector v of a row of B.
func (t *tile) loadB(v int, dst, temp reg.VecPhysical) {
	from := Mem{Base: t.b, Disp: v * t.bytes}
	last := v == t.nv-1 && t.partial
	switch {
	case last && t.bytes == 64:
		t.VMOVUPD_Z(from, maskK, dst)
	case last && t.complex: // the one cut that there is
		t.VMOVUPD(from, dst.AsX())
	case last:
		t.loadTails(temp)
		t.VMASKMOVPD(from, temp, dst)
	default:
		t.VMOVUPD(from, dst)
	}
}

// loadTails loads the mask of the last vector (AVX2, real).
func (t *tile) loadTails(dst reg.VecPhysical) {
	t.VMOVUPD(Mem{Base: t.tailAt}, dst)
}

// store finishes the sums and writes them to C.
func (t *tile) store(rows int, label string, sum func(line, v int) reg.VecPhysical) {
	if t.complex {
		t.combine(rows, label, sum)
	}
	alpha := t.temps[0]
	if !t.complex {
		t.VBROADCASTSD(t.field("weight", 0), alpha)
	}
	// line is where the finished row is.
	line := func(r int) int {
		if t.complex {
			return 2 * r
		}
		return r
	}
	add := t.label("add")
	done := t.label("stored")
	t.CMPQ(t.field("add"), Imm(0))
	t.JNE(LabelRef(add))
	for r := range rows {
		for v := range t.nv {
			x := sum(line(r), v)
			if !t.complex {
				t.VMULPD(alpha, x, x)
			}
			t.storeC(v, x)
		}
		t.ADDQ(t.rowC, t.c)
	}
	t.JMP(LabelRef(done))
	t.Label(add)
	old := t.temps[1]
	for r := range rows {
		for v := range t.nv {
			x := sum(line(r), v)
			from := Op(Mem{Base: t.c, Disp: v * t.bytes})
			if v == t.nv-1 && t.partial {
				t.loadC(v, old, t.temps[2])
				from = old
			}
			if t.complex {
				t.VADDPD(from, x, x)
			} else {
				t.VFMADD213PD(from, alpha, x)
			}
			t.storeC(v, x)
		}
		t.ADDQ(t.rowC, t.c)
	}
	t.Label(done)
}

func (t *tile) loadC(v int, dst, temp reg.VecPhysical) {
	from := Mem{Base: t.c, Disp: v * t.bytes}
	switch {
	case t.bytes == 64:
		t.VMOVUPD_Z(from, maskK, dst)
	case t.complex:
		t.VMOVUPD(from, dst.AsX())
	default:
		t.loadTails(temp)
		t.VMASKMOVPD(from, temp, dst)
	}
}

// storeC writes vector v of a row of C.
func (t *tile) storeC(v int, x reg.VecPhysical) {
	to := Mem{Base: t.c, Disp: v * t.bytes}
	switch {
	case v < t.nv-1 || !t.partial:
		t.VMOVUPD(x, to)
	case t.bytes == 64:
		t.VMOVUPD(x, maskK, to)
	case t.complex:
		t.VMOVUPD(x.AsX(), to)
	default:
		t.storeCut(x, to, t.field("tail"))
	}
}

// combine makes the complex sums, in the lines of the real parts, out of the two sums of each row:
// (re, im) of the first times weight plus (im, re) of the second times cross; then times alpha if it is not real.
func (t *tile) combine(rows int, label string, sum func(line, v int) reg.VecPhysical) {
	weight, cross := t.temps[0], t.temps[1]
	t.pair("weight", weight)
	t.pair("cross", cross)
	for r := range rows {
		for v := range t.nv {
			x, y := sum(2*r, v), sum(2*r+1, v)
			t.VPERMILPD(Imm(0x55), y, y)
			t.VMULPD(cross, y, y)
			t.VFMADD213PD(y, weight, x)
		}
	}
	skip := label + "straight"
	t.CMPQ(t.field("turn"), Imm(0))
	t.JEQ(LabelRef(skip))
	re, im := weight, cross
	t.pair("alphaReal", re)
	t.pair("alphaImag", im)
	for r := range rows {
		for v := range t.nv {
			x, y := sum(2*r, v), sum(2*r+1, v)
			t.VPERMILPD(Imm(0x55), x, y)
			t.VMULPD(im, y, y)
			t.VFMADD213PD(y, re, x)
		}
	}
	t.Label(skip)
}

// pair repeats a pair of numbers over a register.
func (t *tile) pair(field string, dst reg.VecPhysical) {
	if t.bytes == 64 {
		t.VBROADCASTF64X2(t.field(field, 0), dst)
	} else {
		t.VBROADCASTF128(t.field(field, 0), dst)
	}
}
