package main

import (
	"fmt"

	. "github.com/mmcloughlin/avo/operand"
	"github.com/mmcloughlin/avo/reg"
)

// dots is a kernel for few columns in the making: vectors run along k, through rows of A and rows of B's transpose, and each element of C
// is the sum over the lanes of one register (two if complex: the products with re and im exchanged in B have one of their own).
type dots struct {
	*generator
	isa
	complex bool
	columns int

	a, b, c, row, row3, rowB, rowB3, rowC, blocks reg.GPVirtual
	tailAt                                        reg.GPVirtual
	temps, sums                                   []reg.VecPhysical
}

func (g *generator) dots(s isa, complex bool, maxRows, columns int) {
	kind := "Real"
	if complex {
		kind = "Complex"
	}
	g.begin(fmt.Sprintf("dots%s%sx%d", kind, s.name, columns))
	g.args = g.Dereference(g.Param("p"))
	d := &dots{generator: g, isa: s, complex: complex, columns: columns}
	if s.bytes == 64 { // sums apart, as some instructions reach the first sixteen registers only
		d.temps, d.sums = s.regs[:16], s.regs[16:]
	} else {
		d.temps, d.sums = s.regs[8:], s.regs[:8]
	}
	d.a, d.c = g.load("a"), g.load("c")
	d.row, d.rowB, d.rowC = g.load("rowA"), g.load("rowB"), g.load("rowC")
	d.row3 = g.GP64()
	g.LEAQ(Mem{Base: d.row, Index: d.row, Scale: 2}, d.row3)
	if columns > 3 {
		d.rowB3 = g.GP64()
		g.LEAQ(Mem{Base: d.rowB, Index: d.rowB, Scale: 2}, d.rowB3)
	}
	tail := g.load("tail")
	if complex {
		g.ADDQ(tail, tail)
	}
	if s.bytes == 64 {
		bits := g.GP64()
		g.MOVQ(I32(-1), bits)
		g.BZHIQ(tail, bits, bits)
		g.KMOVB(bits.As32(), maskK)
	} else {
		d.tailAt = g.tailAddress(tail)
	}
	left := g.load("rest")
	g.MOVQ(left, g.field("left"))
	rows := g.load("rows")
	d.blocks = g.load("blocks")
	d.b = g.GP64()
	for m := maxRows; m > 1; m-- {
		g.CMPQ(rows, Imm(uint64(m)))
		g.JEQ(LabelRef(fmt.Sprintf("rows%d", m)))
	}
	g.JMP(LabelRef("rows1"))
	for m := maxRows; m >= 1; m-- {
		d.blockLoop(m, fmt.Sprintf("rows%d", m))
		if m > 1 {
			g.MOVQ(g.field("left"), d.blocks)
			g.MOVQ(U32(0), g.field("left"))
			g.TESTQ(d.blocks, d.blocks)
			g.JEQ(LabelRef("done"))
		}
	}
	g.Label("done")
	g.VZEROUPPER()
	g.RET()
}

// blockLoop runs over the blocks of that many rows.
func (d *dots) blockLoop(rows int, label string) {
	parts := 1
	if d.complex {
		parts = 2
	}
	all := rows * d.columns * parts
	sets := 1
	for sets < 4 && 2*sets*all <= len(d.sums) && sets*all < 8 {
		sets *= 2
	}
	sum := func(set, r, j, part int) reg.VecPhysical { return d.sums[((set*rows+r)*d.columns+j)*parts+part] }

	d.Label(label)
	for i := range sets * all {
		r := d.sums[i]
		if d.bytes == 64 {
			d.VPXORQ(r, r, r)
		} else {
			d.VXORPD(r, r, r)
		}
	}
	a, k := d.GP64(), d.load("k")
	d.MOVQ(d.a, a)
	d.MOVQ(d.field("b"), d.b)
	step := func(set int, masked bool) {
		d.step(rows, a, masked, func(r, j, part int) reg.VecPhysical { return sum(set, r, j, part) })
		if !masked {
			d.ADDQ(Imm(uint64(d.bytes)), a)
			d.ADDQ(Imm(uint64(d.bytes)), d.b)
		}
	}
	if sets > 1 {
		d.SUBQ(Imm(uint64(sets)), k)
		d.JLT(LabelRef(label + "odd"))
		d.Label(label + "k")
		for s := range sets {
			step(s, false)
		}
		d.SUBQ(Imm(uint64(sets)), k)
		d.JGE(LabelRef(label + "k"))
		d.Label(label + "odd")
		d.ADDQ(Imm(uint64(sets)), k)
	}
	d.TESTQ(k, k)
	d.JEQ(LabelRef(label + "last"))
	d.Label(label + "one")
	step(0, false)
	d.DECQ(k)
	d.JNE(LabelRef(label + "one"))
	d.Label(label + "last")
	step(0, true)
	for s := sets / 2; s >= 1; s /= 2 {
		for q := range s {
			for i := range all {
				d.VADDPD(d.sums[(q+s)*all+i], d.sums[q*all+i], d.sums[q*all+i])
			}
		}
	}
	for r := range rows {
		d.finish(func(j, part int) reg.VecPhysical { return sum(0, r, j, part) })
		d.ADDQ(d.rowC, d.c)
	}
	advance := d.GP64()
	d.IMUL3Q(Imm(uint64(rows)), d.row, advance)
	d.ADDQ(advance, d.a)
	d.DECQ(d.blocks)
	d.JNE(LabelRef(label))
}

// step multiplies one vector of each row of A with one of each column of B.
func (d *dots) step(rows int, a reg.Register, masked bool, sum func(r, j, part int) reg.VecPhysical) {
	b := d.temps[:d.columns]
	swapped := d.temps[d.columns:]
	x := d.temps[d.columns]
	if d.complex {
		x = d.temps[2*d.columns]
	}
	mask := d.temps[len(d.temps)-1]
	if masked && d.bytes == 32 {
		d.VMOVUPD(Mem{Base: d.tailAt}, mask)
	}
	load := func(from Mem, dst reg.VecPhysical) {
		switch {
		case !masked:
			d.VMOVUPD(from, dst)
		case d.bytes == 64:
			d.VMOVUPD_Z(from, maskK, dst)
		default:
			d.VMASKMOVPD(from, mask, dst)
		}
	}
	for j := range d.columns {
		load(strided(d.b, d.rowB, d.rowB3, j), b[j])
		if d.complex {
			d.VPERMILPD(Imm(0x55), b[j], swapped[j])
		}
	}
	for r := range rows {
		load(strided(a, d.row, d.row3, r), x)
		for j := range d.columns {
			d.VFMADD231PD(b[j], x, sum(r, j, 0))
			if d.complex {
				d.VFMADD231PD(swapped[j], x, sum(r, j, 1))
			}
		}
	}
}

func strided(base, row, row3 reg.Register, i int) Mem {
	switch i {
	case 0:
		return Mem{Base: base}
	case 3:
		return Mem{Base: base, Index: row3, Scale: 1}
	}
	return Mem{Base: base, Index: row, Scale: uint8(i)}
}

// finish adds up the lanes of one row of C, times alpha, and writes it.
func (d *dots) finish(sum func(j, part int) reg.VecPhysical) {
	t := d.temps
	done := d.label("stored")
	var x reg.VecPhysical
	if d.complex {
		for j := range d.columns {
			low, high := t[2*j], t[2*j+1]
			d.VUNPCKLPD(sum(j, 1), sum(j, 0), low)
			d.VUNPCKHPD(sum(j, 1), sum(j, 0), high)
			d.pair("weight", t[4])
			d.VMULPD(t[4], low, low)
			d.pair("cross", t[4])
			d.VFMADD231PD(t[4], high, low)
			d.halve(low, high)
		}
		x = t[0]
		if d.columns == 1 {
			d.fold(x, t[1])
		} else {
			d.merge(t[0], t[2], t[1])
		}
		straight := d.label("straight")
		d.CMPQ(d.field("turn"), Imm(0))
		d.JEQ(LabelRef(straight))
		y := x.AsY()
		d.VPERMILPD(Imm(0x55), y, t[1].AsY())
		d.VBROADCASTF128(d.field("alphaReal", 0), t[2].AsY())
		d.VMULPD(t[2].AsY(), y, y)
		d.VBROADCASTF128(d.field("alphaImag", 0), t[2].AsY())
		d.VFMADD231PD(t[2].AsY(), t[1].AsY(), y)
		d.Label(straight)
		d.CMPQ(d.field("add"), Imm(0))
		d.JEQ(LabelRef(done))
		if d.columns == 1 {
			d.VADDPD(Mem{Base: d.c}, x.AsX(), x.AsX())
		} else {
			d.VADDPD(Mem{Base: d.c}, x.AsY(), x.AsY())
		}
		d.Label(done)
		if d.columns == 1 {
			d.VMOVUPD(x.AsX(), Mem{Base: d.c})
		} else {
			d.VMOVUPD(x.AsY(), Mem{Base: d.c})
		}
		return
	}
	for j := 0; j < d.columns; j += 2 {
		low, high := t[j], t[j+1]
		if j+1 < d.columns {
			d.VUNPCKLPD(sum(j+1, 0), sum(j, 0), low)
			d.VUNPCKHPD(sum(j+1, 0), sum(j, 0), high)
		} else {
			d.VUNPCKLPD(sum(j, 0), sum(j, 0), low)
			d.VUNPCKHPD(sum(j, 0), sum(j, 0), high)
		}
		d.VADDPD(high, low, low)
		d.halve(low, high)
	}
	x = t[0]
	if d.columns <= 2 {
		d.fold(x, t[1])
	} else {
		d.merge(t[0], t[2], t[1])
	}
	alpha, old := t[1].AsY(), t[2]
	d.VBROADCASTSD(d.field("weight", 0), alpha)
	d.VMULPD(alpha, x.AsY(), x.AsY())
	d.CMPQ(d.field("add"), Imm(0))
	d.JEQ(LabelRef(done))
	switch d.columns {
	case 1:
		d.VADDSD(Mem{Base: d.c}, x.AsX(), x.AsX())
	case 2:
		d.VADDPD(Mem{Base: d.c}, x.AsX(), x.AsX())
	case 3:
		third := t[3].AsX()
		d.VMOVUPD(Mem{Base: d.c}, old.AsX())
		d.VMOVSD(Mem{Base: d.c, Disp: 16}, third)
		d.VINSERTF128(Imm(1), third, old.AsY(), old.AsY())
		d.VADDPD(old.AsY(), x.AsY(), x.AsY())
	case 4:
		d.VADDPD(Mem{Base: d.c}, x.AsY(), x.AsY())
	}
	d.Label(done)
	switch d.columns {
	case 1:
		d.VMOVSD(x.AsX(), Mem{Base: d.c})
	case 2:
		d.VMOVUPD(x.AsX(), Mem{Base: d.c})
	case 3:
		d.VMOVUPD(x.AsX(), Mem{Base: d.c})
		d.VEXTRACTF128(Imm(1), x.AsY(), old.AsX())
		d.VMOVSD(old.AsX(), Mem{Base: d.c, Disp: 16})
	case 4:
		d.VMOVUPD(x.AsY(), Mem{Base: d.c})
	}
}

// halve adds the upper half of a 512-bit register to the lower.
func (d *dots) halve(x, temp reg.VecPhysical) {
	if d.bytes == 64 {
		d.VEXTRACTF64X4(Imm(1), x, temp.AsY())
		d.VADDPD(temp.AsY(), x.AsY(), x.AsY())
	}
}

// fold adds the upper half of a 256-bit register to the lower.
func (d *dots) fold(x, temp reg.VecPhysical) {
	d.VEXTRACTF128(Imm(1), x.AsY(), temp.AsX())
	d.VADDPD(temp.AsX(), x.AsX(), x.AsX())
}

// merge adds the halves of two 256-bit registers: the lower one of the result is that of x.
func (d *dots) merge(x, y, temp reg.VecPhysical) {
	d.VPERM2F128(Imm(0x20), y.AsY(), x.AsY(), temp.AsY())
	d.VPERM2F128(Imm(0x31), y.AsY(), x.AsY(), x.AsY())
	d.VADDPD(temp.AsY(), x.AsY(), x.AsY())
}

// pair repeats a pair of numbers over a register.
func (d *dots) pair(field string, dst reg.VecPhysical) {
	if d.bytes == 64 {
		d.VBROADCASTF64X2(d.field(field, 0), dst)
	} else {
		d.VBROADCASTF128(d.field(field, 0), dst)
	}
}
