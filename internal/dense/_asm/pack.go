package main

import (
	"fmt"

	. "github.com/mmcloughlin/avo/operand"
	"github.com/mmcloughlin/avo/reg"
)

// parameter brings an argument into a new register.
func (g *generator) parameter(name string) reg.GPVirtual {
	r := g.GP64()
	g.Load(g.Param(name), r)
	return r
}

// packRows generates the copy of a panel, one loop for each number of vectors.
func (g *generator) packRows(s isa) {
	g.begin("packRows" + s.name)
	dst, src, k, ld := g.parameter("dst"), g.parameter("src"), g.parameter("k"), g.parameter("ld")
	vectors, tail := g.parameter("vectors"), g.parameter("tail")
	mask := s.regs[3]
	if s.bytes == 64 {
		bits := g.GP64()
		g.MOVQ(I32(-1), bits)
		g.BZHIQ(tail, bits, bits)
		g.KMOVB(bits.As32(), maskK)
	} else {
		g.tailMask(tail, mask)
	}
	for n := 3; n >= 1; n-- {
		g.CMPQ(vectors, Imm(uint64(n)))
		g.JEQ(LabelRef(fmt.Sprintf("copy%d", n)))
	}
	for n := 1; n <= 3; n++ {
		loop := fmt.Sprintf("copy%d", n)
		g.Label(loop)
		for v := range n {
			from := Mem{Base: src, Disp: v * s.bytes}
			switch {
			case v < n-1:
				g.VMOVUPD(from, s.regs[v])
			case s.bytes == 64:
				g.VMOVUPD_Z(from, maskK, s.regs[v])
			default:
				g.VMASKMOVPD(from, mask, s.regs[v])
			}
		}
		for v := range n {
			g.VMOVUPD(s.regs[v], Mem{Base: dst, Disp: v * s.bytes})
		}
		g.ADDQ(ld, src)
		g.ADDQ(Imm(uint64(n*s.bytes)), dst)
		g.DECQ(k)
		g.JNE(LabelRef(loop))
		g.VZEROUPPER()
		g.RET()
	}
}

// tailMask sets the first n lanes of an AVX register, 1 <= n <= 4.
func (g *generator) tailMask(n reg.Register, dst reg.VecPhysical) {
	g.VMOVUPD(Mem{Base: g.tailAddress(n)}, dst)
}

// tailAddress is where a mask of n lanes begins.
func (g *generator) tailAddress(n reg.Register) reg.GPVirtual {
	table, at := g.GP64(), g.GP64()
	g.LEAQ(g.tails(), table)
	g.MOVQ(U32(4), at)
	g.SUBQ(n, at)
	g.LEAQ(Mem{Base: table, Index: at, Scale: 8}, at)
	return at
}

// packColumns generates a transposing copy by square blocks of as many elements as a vector holds.
func (g *generator) packColumns(s isa, complex bool) {
	kind, edge, size := "Real", s.lanes(), 8
	if complex {
		kind, edge, size = "Complex", s.lanes()/2, 16
	}
	g.begin("packColumns" + kind + s.name)
	p := &packer{generator: g, isa: s, edge: edge, size: size}
	p.dst, p.src, p.ld, p.rows = g.parameter("dst"), g.parameter("src"), g.parameter("ld"), g.parameter("rows")
	p.width = g.parameter("width")
	p.ld3 = g.GP64()
	g.LEAQ(Mem{Base: p.ld, Index: p.ld, Scale: 2}, p.ld3)

	g.Label("group")
	p.to, p.from, p.k = g.GP64(), g.GP64(), g.parameter("k")
	g.MOVQ(p.dst, p.to)
	g.MOVQ(p.src, p.from)
	g.CMPQ(p.rows, Imm(uint64(edge)))
	g.JLT(LabelRef("few"))
	for _, full := range []bool{true, false} {
		name := "full"
		if !full {
			name = "few"
		}
		g.Label(name)
		g.SUBQ(Imm(uint64(edge)), p.k)
		g.JLT(LabelRef(name + "tail"))
		g.Label(name + "loop")
		p.block(full, true)
		g.ADDQ(Imm(uint64(s.bytes)), p.from)
		g.SUBQ(Imm(uint64(edge)), p.k)
		g.JGE(LabelRef(name + "loop"))
		g.Label(name + "tail")
		g.ADDQ(Imm(uint64(edge)), p.k)
		g.JEQ(LabelRef("next"))
		p.block(full, false)
		if full {
			g.JMP(LabelRef("next"))
		}
	}
	g.Label("next")
	g.ADDQ(Imm(uint64(s.bytes)), p.dst)
	g.IMUL3Q(Imm(uint64(edge)), p.ld, p.from)
	g.ADDQ(p.from, p.src)
	g.SUBQ(Imm(uint64(edge)), p.rows)
	g.JGT(LabelRef("group"))
	g.VZEROUPPER()
	g.RET()
}

type packer struct {
	*generator
	isa
	edge, size                                  int
	dst, src, ld, ld3, rows, width, to, from, k reg.GPVirtual
}

// block transposes one square; not all rows of the source, not all of its columns if so said.
func (p *packer) block(allRows, allColumns bool) {
	in := p.regs[:p.edge]
	mask := p.regs[15]
	switch {
	case allColumns:
	case p.bytes == 64:
		bits := p.GP64()
		count := p.k
		if p.size == 16 {
			count = p.GP64()
			p.LEAQ(Mem{Base: p.k, Index: p.k, Scale: 1}, count)
		}
		p.MOVQ(I32(-1), bits)
		p.BZHIQ(count, bits, bits)
		p.KMOVB(bits.As32(), maskK)
	case p.size == 8:
		p.tailMask(p.k, mask)
	}
	shuffle := p.label("shuffle")
	if !allRows {
		for _, r := range in {
			x := r.AsX()
			p.VXORPD(x, x, x)
		}
	}
	var from3 reg.GPVirtual
	if p.edge > 4 {
		from3 = p.GP64()
		p.LEAQ(Mem{Base: p.from, Index: p.ld3, Scale: 1}, from3)
	}
	for r, x := range in {
		if !allRows && r > 0 {
			p.CMPQ(p.rows, Imm(uint64(r)))
			p.JEQ(LabelRef(shuffle))
		}
		at := p.row(r, from3)
		switch {
		case allColumns:
			p.VMOVUPD(at, x)
		case p.bytes == 64:
			p.VMOVUPD_Z(at, maskK, x)
		case p.size == 8:
			p.VMASKMOVPD(at, mask, x)
		default:
			p.VMOVUPD(at, x.AsX())
		}
	}
	p.Label(shuffle)
	out := p.transpose(in)
	stored := p.label("stored")
	for l, x := range out {
		if !allColumns && l > 0 {
			p.CMPQ(p.k, Imm(uint64(l)))
			p.JEQ(LabelRef(stored))
		}
		p.VMOVUPD(x, Mem{Base: p.to})
		p.ADDQ(p.width, p.to)
	}
	p.Label(stored)
}

func (p *packer) row(r int, from3 reg.GPVirtual) Mem {
	switch {
	case r == 0:
		return Mem{Base: p.from}
	case r == 3:
		return Mem{Base: p.from, Index: p.ld3, Scale: 1}
	case r <= 4:
		return Mem{Base: p.from, Index: p.ld, Scale: uint8(r)}
	case r == 6:
		return Mem{Base: from3, Index: p.ld3, Scale: 1}
	}
	return Mem{Base: from3, Index: p.ld, Scale: uint8(r - 3)}
}

// transpose returns the registers that hold the columns of in.
func (p *packer) transpose(in []reg.VecPhysical) []reg.VecPhysical {
	next := p.edge
	fresh := func() reg.VecPhysical { next++; return p.regs[next-1] }
	pair := func(op func(...Op), x, y reg.VecPhysical) reg.VecPhysical {
		r := fresh()
		op(y, x, r)
		return r
	}
	low := func(x, y reg.VecPhysical) reg.VecPhysical { return pair(p.VUNPCKLPD, x, y) }
	high := func(x, y reg.VecPhysical) reg.VecPhysical { return pair(p.VUNPCKHPD, x, y) }
	even := func(x, y reg.VecPhysical) reg.VecPhysical { // 128-bit lanes 0 and 2 of each
		r := fresh()
		p.VSHUFF64X2(Imm(0x88), y, x, r)
		return r
	}
	odd := func(x, y reg.VecPhysical) reg.VecPhysical {
		r := fresh()
		p.VSHUFF64X2(Imm(0xdd), y, x, r)
		return r
	}
	lower := func(x, y reg.VecPhysical) reg.VecPhysical {
		r := fresh()
		p.VPERM2F128(Imm(0x20), y, x, r)
		return r
	}
	upper := func(x, y reg.VecPhysical) reg.VecPhysical {
		r := fresh()
		p.VPERM2F128(Imm(0x31), y, x, r)
		return r
	}
	out := make([]reg.VecPhysical, p.edge)
	switch {
	case p.bytes == 64 && p.size == 8:
		for half, unpack := range []func(x, y reg.VecPhysical) reg.VecPhysical{low, high} {
			next = 8 + 8*half
			t := [4]reg.VecPhysical{}
			for i := range t {
				t[i] = unpack(in[2*i], in[2*i+1])
			}
			if half == 1 {
				next = 0 // in is no longer needed
			}
			u0, w0 := even(t[0], t[1]), even(t[2], t[3])
			u1, w1 := odd(t[0], t[1]), odd(t[2], t[3])
			if half == 0 {
				next = 24
			}
			out[half], out[half+4] = even(u0, w0), odd(u0, w0)
			out[half+2], out[half+6] = even(u1, w1), odd(u1, w1)
		}
	case p.bytes == 64:
		u0, w0 := even(in[0], in[1]), even(in[2], in[3])
		u1, w1 := odd(in[0], in[1]), odd(in[2], in[3])
		out[0], out[2] = even(u0, w0), odd(u0, w0)
		out[1], out[3] = even(u1, w1), odd(u1, w1)
	case p.size == 8:
		t0, t1, t2, t3 := low(in[0], in[1]), high(in[0], in[1]), low(in[2], in[3]), high(in[2], in[3])
		out[0], out[2] = lower(t0, t2), upper(t0, t2)
		out[1], out[3] = lower(t1, t3), upper(t1, t3)
	default:
		out[0], out[1] = lower(in[0], in[1]), upper(in[0], in[1])
	}
	return out
}
