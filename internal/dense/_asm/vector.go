package main

import (
	. "github.com/mmcloughlin/avo/operand"
	"github.com/mmcloughlin/avo/reg"
)

// vector is a kernel on one or two vectors in the making.
type vector struct {
	*generator
	isa
	x, y, n reg.GPVirtual // y is absent in some
	also    reg.GPVirtual // a third vector, absent in most
	mask    reg.VecPhysical
}

// vectors generates the kernels of vector_amd64.go for one instruction set.
func (g *generator) vectors(s isa) {
	g.dotReal(s)
	g.dotComplex(s)
	g.axpy(s, false)
	g.axpy(s, true)
	g.scale(s, false)
	g.scale(s, true)
	g.largest(s)
	g.conjugate(s)
}

func (g *generator) vector(s isa, name string, two bool) *vector {
	g.begin(name + s.name)
	v := &vector{generator: g, isa: s, x: g.parameter("x"), n: g.parameter("n"), mask: s.regs[15]}
	if two {
		v.y = g.parameter("y")
	}
	return v
}

// loop runs body for every vector: unrolled, with an index below unroll; once for each left over; once more, masked, for a cut one.
func (v *vector) loop(unroll int, body func(i int, at int, masked bool)) {
	step := func(vectors int) {
		for _, p := range []reg.GPVirtual{v.x, v.y, v.also} {
			if p != nil {
				v.ADDQ(U32(vectors*v.bytes), p)
			}
		}
	}
	if unroll > 1 {
		v.SUBQ(Imm(uint64(unroll*v.lanes())), v.n)
		v.JLT(LabelRef("few"))
		v.Label("many")
		for i := range unroll {
			body(i, i*v.bytes, false)
		}
		step(unroll)
		v.SUBQ(Imm(uint64(unroll*v.lanes())), v.n)
		v.JGE(LabelRef("many"))
		v.Label("few")
		v.ADDQ(Imm(uint64(unroll*v.lanes())), v.n)
	}
	v.SUBQ(Imm(uint64(v.lanes())), v.n)
	v.JLT(LabelRef("cut"))
	v.Label("one")
	body(0, 0, false)
	step(1)
	v.SUBQ(Imm(uint64(v.lanes())), v.n)
	v.JGE(LabelRef("one"))
	v.Label("cut")
	v.ADDQ(Imm(uint64(v.lanes())), v.n)
	v.JEQ(LabelRef("end"))
	if v.bytes == 64 {
		bits := v.GP64()
		v.MOVQ(I32(-1), bits)
		v.BZHIQ(v.n, bits, bits)
		v.KMOVB(bits.As32(), maskK)
	} else {
		v.tailMask(v.n, v.mask)
	}
	body(0, 0, true)
	v.Label("end")
}

func (v *vector) load(base reg.Register, at int, masked bool, dst reg.VecPhysical) {
	from := Mem{Base: base, Disp: at}
	switch {
	case !masked:
		v.VMOVUPD(from, dst)
	case v.bytes == 64:
		v.VMOVUPD_Z(from, maskK, dst)
	default:
		v.VMASKMOVPD(from, v.mask, dst)
	}
}

func (v *vector) store(src reg.VecPhysical, base reg.Register, at int, masked bool) {
	to := Mem{Base: base, Disp: at}
	switch {
	case !masked:
		v.VMOVUPD(src, to)
	case v.bytes == 64:
		v.VMOVUPD(src, maskK, to)
	default:
		v.storeCut(src, to, v.n)
	}
}

// storeCut writes the first n of four numbers, 1 <= n <= 3, in pieces: masked stores of AVX2 are slow on some processors.
func (g *generator) storeCut(src reg.VecPhysical, to Mem, n Op) {
	one, end := g.label("one"), g.label("end")
	g.CMPQ(n, Imm(2))
	g.JLT(LabelRef(one))
	g.VMOVUPD(src.AsX(), to)
	g.JEQ(LabelRef(end))
	g.VEXTRACTF128(Imm(1), src, src.AsX())
	g.VMOVSD(src.AsX(), to.Offset(16))
	g.JMP(LabelRef(end))
	g.Label(one)
	g.VMOVSD(src.AsX(), to)
	g.Label(end)
}

func (v *vector) clear(regs ...reg.VecPhysical) {
	for _, r := range regs {
		x := r.AsX()
		v.VXORPD(x, x, x)
	}
}

// total adds registers up in pairs, then the lanes of the first, down to two.
func (v *vector) total(sums []reg.VecPhysical, temp reg.VecPhysical) {
	for n := len(sums) / 2; n > 0; n /= 2 {
		for i := range n {
			v.VADDPD(sums[i+n], sums[i], sums[i])
		}
	}
	s := sums[0]
	if v.bytes == 64 {
		v.VEXTRACTF64X4(Imm(1), s, temp.AsY())
		v.VADDPD(temp.AsY(), s.AsY(), s.AsY())
	}
	v.VEXTRACTF128(Imm(1), s.AsY(), temp.AsX())
	v.VADDPD(temp.AsX(), s.AsX(), s.AsX())
}

// done returns what store puts into the results; legacy instructions as it uses must not meet dirty upper halves.
func (v *vector) done(store func()) {
	v.VZEROUPPER()
	if store != nil {
		store()
	}
	v.RET()
}

func (g *generator) dotReal(s isa) {
	v := g.vector(s, "dotReal", true)
	sums, x, y := s.regs[:4], s.regs[4], s.regs[5]
	v.clear(sums...)
	v.loop(4, func(i, at int, masked bool) {
		v.load(v.x, at, masked, x)
		if masked {
			v.load(v.y, at, masked, y)
			v.VFMADD231PD(y, x, sums[i])
		} else {
			v.VFMADD231PD(Mem{Base: v.y, Disp: at}, x, sums[i])
		}
	})
	v.total(sums, x)
	v.VUNPCKHPD(sums[0].AsX(), sums[0].AsX(), x.AsX())
	v.VADDSD(x.AsX(), sums[0].AsX(), sums[0].AsX())
	v.done(func() { g.Store(sums[0].AsX(), g.ReturnIndex(0)) })
}

func (g *generator) dotComplex(s isa) {
	v := g.vector(s, "dotComplex", true)
	straight, crossed, x, y := s.regs[:4], s.regs[4:8], s.regs[8], s.regs[9]
	v.clear(straight...)
	v.clear(crossed...)
	v.loop(4, func(i, at int, masked bool) {
		v.load(v.x, at, masked, x)
		v.load(v.y, at, masked, y)
		v.VFMADD231PD(y, x, straight[i]) // (re re, im im)
		v.VPERMILPD(Imm(0x55), y, y)
		v.VFMADD231PD(y, x, crossed[i]) // (re im, im re)
	})
	v.total(straight, x)
	v.total(crossed, x)
	re, im := straight[0].AsX(), crossed[0].AsX()
	v.VUNPCKHPD(re, re, x.AsX())
	v.VADDSD(x.AsX(), re, re)
	v.VUNPCKHPD(im, im, x.AsX())
	v.VSUBSD(x.AsX(), im, im)
	v.done(func() {
		g.Store(re, g.Return("re"))
		g.Store(im, g.Return("im"))
	})
}

// factor loads alpha: its real part in all lanes of the first register, and, if complex, (-im, im) in the second.
func (v *vector) factor(complex bool) (re, im reg.VecPhysical) {
	re, im = v.regs[13], v.regs[14]
	if !complex {
		v.Load(v.Param("alpha"), re.AsX())
		v.VBROADCASTSD(re.AsX(), re)
		return re, im
	}
	temp := v.regs[12]
	v.Load(v.Param("re"), re.AsX())
	v.VBROADCASTSD(re.AsX(), re)
	v.Load(v.Param("im"), im.AsX())
	v.clear(temp)
	v.VSUBSD(im.AsX(), temp.AsX(), temp.AsX())
	v.VUNPCKLPD(im.AsX(), temp.AsX(), im.AsX())
	if v.bytes == 64 {
		v.VSHUFF64X2(Imm(0), im, im, im)
	} else {
		v.VINSERTF128(Imm(1), im.AsX(), im.AsY(), im.AsY())
	}
	return re, im
}

func (g *generator) axpy(s isa, complex bool) {
	kind := "Real"
	if complex {
		kind = "Complex"
	}
	v := g.vector(s, "axpy"+kind, true)
	re, im := v.factor(complex)
	v.loop(4, func(i, at int, masked bool) {
		x, y := s.regs[2*i], s.regs[2*i+1]
		v.load(v.y, at, masked, y)
		v.load(v.x, at, masked, x)
		v.VFMADD231PD(x, re, y)
		if complex {
			v.VPERMILPD(Imm(0x55), x, x)
			v.VFMADD231PD(x, im, y)
		}
		v.store(y, v.y, at, masked)
	})
	v.done(nil)
}

func (g *generator) scale(s isa, complex bool) {
	kind := "Real"
	if complex {
		kind = "Complex"
	}
	v := g.vector(s, "scale"+kind, false)
	re, im := v.factor(complex)
	v.loop(4, func(i, at int, masked bool) {
		x, y := s.regs[2*i], s.regs[2*i+1]
		v.load(v.x, at, masked, x)
		if complex {
			v.VPERMILPD(Imm(0x55), x, y)
			v.VMULPD(re, x, x)
			v.VFMADD231PD(y, im, x)
		} else {
			v.VMULPD(re, x, x)
		}
		v.store(x, v.x, at, masked)
	})
	v.done(nil)
}

// largest compares magnitudes as integers: the bits of a NaN are the largest of all.
func (g *generator) largest(s isa) {
	v := g.vector(s, "largest", false)
	tops, abs := s.regs[:4], s.regs[14]
	v.clear(tops...)
	bits := g.GP64()
	g.MOVQ(I32(-1), bits)
	g.SHRQ(Imm(1), bits)
	g.VMOVQ(bits, abs.AsX())
	g.VPBROADCASTQ(abs.AsX(), abs)
	larger := func(x, top, temp reg.VecPhysical) {
		if s.bytes == 64 {
			v.VPMAXUQ(x, top, top)
			return
		}
		v.VPCMPGTQ(top, x, temp)
		v.VBLENDVPD(temp, x, top, top)
	}
	v.loop(4, func(i, at int, masked bool) {
		x := s.regs[4+2*i]
		v.load(v.x, at, masked, x)
		v.VANDPD(abs, x, x)
		larger(x, tops[i], s.regs[5+2*i])
	})
	larger(tops[1], tops[0], s.regs[4])
	larger(tops[3], tops[2], s.regs[4])
	larger(tops[2], tops[0], s.regs[4])
	top := tops[0]
	fold := func(cut func()) {
		cut()
		larger(s.regs[5], top, s.regs[4])
	}
	if s.bytes == 64 {
		fold(func() { v.VEXTRACTF64X4(Imm(1), top, s.regs[5].AsY()) })
	}
	fold(func() { v.VEXTRACTF128(Imm(1), top.AsY(), s.regs[5].AsX()) })
	fold(func() { v.VUNPCKHPD(top.AsX(), top.AsX(), s.regs[5].AsX()) })
	v.done(func() { g.Store(top.AsX(), g.ReturnIndex(0)) })
}

func (g *generator) conjugate(s isa) {
	v := g.vector(s, "conjugate", true)
	sign, bits := s.regs[14], g.GP64()
	g.MOVQ(I32(1), bits)
	g.SHLQ(Imm(63), bits)
	v.clear(sign)
	g.VMOVQ(bits, s.regs[13].AsX())
	g.VUNPCKLPD(s.regs[13].AsX(), sign.AsX(), sign.AsX())
	if s.bytes == 64 {
		v.VSHUFF64X2(Imm(0), sign, sign, sign)
	} else {
		v.VINSERTF128(Imm(1), sign.AsX(), sign.AsY(), sign.AsY())
	}
	v.loop(4, func(i, at int, masked bool) {
		x := s.regs[i]
		v.load(v.x, at, masked, x)
		v.VXORPD(sign, x, x)
		v.store(x, v.y, at, masked)
	})
	v.done(nil)
}
