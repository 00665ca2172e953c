package main

import (
	"fmt"
	"math"

	. "github.com/mmcloughlin/avo/operand"
	"github.com/mmcloughlin/avo/reg"
)

// symmetric is a kernel in the making that reads rows of a matrix once, for their dot products with v and for their sum, weighted by x.
// Real rows have one sum and one weight each, complex ones two: the products with v and with v, re and im exchanged; re and im of x.
type symmetric struct {
	*generator
	isa
	parts             int // 2 if complex
	sums, weights     []reg.VecPhysical
	v, swapped, y     reg.VecPhysical
	crossed, row      reg.VecPhysical
	signs, mask       reg.VecPhysical
	a, a3, lda, lda3  reg.GPVirtual
	vAt, yAt, x, dots reg.GPVirtual
	left, n           reg.GPVirtual
}

func (g *generator) symmetric(s isa, complex bool) {
	kind, parts, most := "Real", 1, 8
	if complex {
		kind, parts, most = "Complex", 2, 4
	}
	if s.bytes == 32 {
		most /= 2
	}
	g.begin("symmetric" + kind + s.name)
	all := most * parts
	k := &symmetric{generator: g, isa: s, parts: parts, sums: s.regs[:all], weights: s.regs[all : 2*all]}
	rest := s.regs[2*all:]
	k.v, k.swapped, k.y, k.crossed, k.row, k.signs, k.mask = rest[0], rest[1], rest[2], rest[3], rest[4], rest[5], s.regs[15]
	k.a, k.lda, k.x, k.dots = g.parameter("a"), g.parameter("lda"), g.parameter("x"), g.parameter("dots")
	k.n = g.parameter("n")
	rows := g.parameter("rows")
	k.lda3 = g.GP64()
	g.LEAQ(Mem{Base: k.lda, Index: k.lda, Scale: 2}, k.lda3)
	k.prepareMask()
	if complex {
		k.prepareSigns()
	}
	for m := most; m >= 1; m /= 2 {
		name, next := fmt.Sprintf("rows%d", m), fmt.Sprintf("below%d", m)
		g.Label(name)
		g.CMPQ(rows, Imm(uint64(m)))
		g.JLT(LabelRef(next))
		k.rows(m, name)
		g.SUBQ(Imm(uint64(m)), rows)
		g.JMP(LabelRef(name))
		g.Label(next)
	}
	g.VZEROUPPER()
	g.RET()
}

// prepareMask makes the mask of the last, cut vector.
func (k *symmetric) prepareMask() {
	tail := k.GP64()
	k.MOVQ(k.n, tail)
	k.ANDQ(Imm(uint64(k.lanes()-1)), tail)
	if k.bytes == 64 {
		bits := k.GP64()
		k.MOVQ(I32(-1), bits)
		k.BZHIQ(tail, bits, bits)
		k.KMOVB(bits.As32(), maskK)
		return
	}
	k.tailMask(tail, k.mask)
}

// prepareSigns puts (-1, 1) into all pairs.
func (k *symmetric) prepareSigns() {
	bits, temp := k.GP64(), k.sums[0]
	k.MOVQ(U64(math.Float64bits(-1)), bits)
	k.VMOVQ(bits, temp.AsX())
	k.MOVQ(U64(math.Float64bits(1)), bits)
	k.VMOVQ(bits, k.sums[1].AsX())
	k.VUNPCKLPD(k.sums[1].AsX(), temp.AsX(), temp.AsX())
	if k.bytes == 64 {
		k.VSHUFF64X2(Imm(0), temp, temp, k.signs)
	} else {
		k.VINSERTF128(Imm(1), temp.AsX(), temp.AsY(), k.signs.AsY())
	}
}

// rows generates the loop along that many rows.
func (k *symmetric) rows(rows int, name string) {
	all := rows * k.parts
	for i := range all {
		x := k.sums[i].AsX()
		k.VXORPD(x, x, x)
		k.VBROADCASTSD(Mem{Base: k.x, Disp: 8 * i}, k.weights[i])
	}
	a := k.GP64()
	k.MOVQ(k.a, a)
	k.a3 = k.GP64()
	k.LEAQ(Mem{Base: a, Index: k.lda3, Scale: 1}, k.a3)
	k.vAt, k.yAt, k.left = k.parameter("v"), k.parameter("y"), k.GP64()
	k.MOVQ(k.n, k.left)
	k.SUBQ(Imm(uint64(k.lanes())), k.left)
	k.JLT(LabelRef(name + "cut"))
	k.Label(name + "loop")
	k.step(rows, a, false)
	for _, p := range []reg.Register{a, k.a3, k.vAt, k.yAt} {
		k.ADDQ(Imm(uint64(k.bytes)), p)
	}
	k.SUBQ(Imm(uint64(k.lanes())), k.left)
	k.JGE(LabelRef(name + "loop"))
	k.Label(name + "cut")
	k.ADDQ(Imm(uint64(k.lanes())), k.left)
	k.JEQ(LabelRef(name + "end"))
	k.step(rows, a, true)
	k.Label(name + "end")
	for r := range rows {
		k.finish(r)
	}
	k.ADDQ(Imm(uint64(8*all)), k.x)
	k.ADDQ(Imm(uint64(8*all)), k.dots)
	k.IMUL3Q(Imm(uint64(rows)), k.lda, a)
	k.ADDQ(a, k.a)
}

// step takes one vector of each row.
func (k *symmetric) step(rows int, a reg.Register, masked bool) {
	load := func(from Mem, dst reg.VecPhysical) {
		switch {
		case !masked:
			k.VMOVUPD(from, dst)
		case k.bytes == 64:
			k.VMOVUPD_Z(from, maskK, dst)
		default:
			k.VMASKMOVPD(from, k.mask, dst)
		}
	}
	load(Mem{Base: k.vAt}, k.v)
	load(Mem{Base: k.yAt}, k.y)
	if k.parts == 2 {
		k.VPERMILPD(Imm(0x55), k.v, k.swapped)
	}
	for r := range rows {
		load(k.place(r, a), k.row)
		i := k.parts * r
		k.VFMADD231PD(k.v, k.row, k.sums[i])
		k.VFMADD231PD(k.weights[i], k.row, k.y)
		if k.parts == 1 {
			continue
		}
		k.VFMADD231PD(k.swapped, k.row, k.sums[i+1])
		if r == 0 {
			k.VMULPD(k.weights[1], k.row, k.crossed)
		} else {
			k.VFMADD231PD(k.weights[i+1], k.row, k.crossed)
		}
	}
	if k.parts == 2 { // (re, im) of the row times i im of x is (-im, re) im
		k.VPERMILPD(Imm(0x55), k.crossed, k.crossed)
		k.VFMADD231PD(k.signs, k.crossed, k.y)
	}
	switch to := (Mem{Base: k.yAt}); {
	case !masked:
		k.VMOVUPD(k.y, to)
	case k.bytes == 64:
		k.VMOVUPD(k.y, maskK, to)
	default:
		k.storeCut(k.y, to, k.left)
	}
}

// place is where the next vector of row r is.
func (k *symmetric) place(r int, a reg.Register) Mem {
	switch {
	case r == 0:
		return Mem{Base: a}
	case r == 3:
		return Mem{Base: k.a3}
	case r <= 4:
		return Mem{Base: a, Index: k.lda, Scale: uint8(r)}
	case r == 6:
		return Mem{Base: k.a3, Index: k.lda3, Scale: 1}
	}
	return Mem{Base: k.a3, Index: k.lda, Scale: uint8(r - 3)}
}

// finish adds the sums of row r to its dot product.
func (k *symmetric) finish(r int) {
	temp := k.weights[0]
	for part := range k.parts {
		sum := k.sums[k.parts*r+part]
		if k.bytes == 64 {
			k.VEXTRACTF64X4(Imm(1), sum, temp.AsY())
			k.VADDPD(temp.AsY(), sum.AsY(), sum.AsY())
		}
		x := sum.AsX()
		k.VEXTRACTF128(Imm(1), sum.AsY(), temp.AsX())
		k.VADDPD(temp.AsX(), x, x)
		k.VUNPCKHPD(x, x, temp.AsX())
		if k.parts == 2 && part == 0 {
			k.VSUBSD(temp.AsX(), x, x)
		} else {
			k.VADDSD(temp.AsX(), x, x)
		}
		to := Mem{Base: k.dots, Disp: 8 * (k.parts*r + part)}
		k.VADDSD(to, x, x)
		k.VMOVSD(x, to)
	}
}
