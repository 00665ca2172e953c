package main

import "github.com/mmcloughlin/avo/reg"

// secular generates the kernels of secular_amd64.go for one instruction set.
func (g *generator) secular(s isa) {
	for _, squares := range []bool{false, true} {
		g.secularSums(s, squares)
		g.secularQuotients(s, squares)
		g.secularRow(s, squares, false)
	}
	g.secularRow(s, true, true)
}

func squaresName(squares bool) string {
	if squares {
		return "Squares"
	}
	return ""
}

// poles is a kernel over poles x in the making.
type poles struct {
	*vector
	squares bool
	pole, t reg.VecPhysical
}

func (g *generator) poles(s isa, name string, squares bool) *poles {
	p := &poles{vector: g.vector(s, name, true), squares: squares, pole: s.regs[13], t: s.regs[14]}
	p.spread("pole", p.pole)
	p.spread("t", p.t)
	return p
}

// spread puts an argument into all lanes.
func (v *vector) spread(name string, dst reg.VecPhysical) {
	v.Load(v.Param(name), dst.AsX())
	v.VBROADCASTSD(dst.AsX(), dst)
}

// gap computes D_x - D at pole + t.
func (p *poles) gap(x, dst, temp reg.VecPhysical) {
	p.VSUBPD(p.pole, x, dst)
	p.VSUBPD(p.t, dst, dst)
	if p.squares {
		p.VADDPD(p.pole, x, temp)
		p.VADDPD(p.t, temp, temp)
		p.VMULPD(temp, dst, dst)
	}
}

// divide computes x/y, zero in the lanes of a cut vector that are not its own.
func (p *poles) divide(x, y, dst reg.VecPhysical, masked bool) {
	switch {
	case !masked:
		p.VDIVPD(y, x, dst)
	case p.bytes == 64:
		p.VDIVPD_Z(y, x, maskK, dst)
	default:
		p.VDIVPD(y, x, dst)
		p.VANDPD(p.mask, dst, dst)
	}
}

func (g *generator) secularSums(s isa, squares bool) {
	p := g.poles(s, "secularSums"+squaresName(squares), squares)
	sums, slopes := s.regs[0:2], s.regs[2:4]
	p.clear(sums...)
	p.clear(slopes...)
	p.loop(2, func(i, at int, masked bool) {
		x, z, q, temp := s.regs[4+4*i], s.regs[5+4*i], s.regs[6+4*i], s.regs[7+4*i]
		p.load(p.x, at, masked, x)
		p.load(p.y, at, masked, z)
		p.gap(x, q, temp)
		p.divide(z, q, q, masked)
		p.VFMADD231PD(q, z, sums[i])
		p.VFMADD231PD(q, q, slopes[i])
	})
	p.total(sums, s.regs[4])
	p.total(slopes, s.regs[4])
	sum, slope, temp := sums[0].AsX(), slopes[0].AsX(), s.regs[4].AsX()
	p.lanes2(sum, temp)
	p.lanes2(slope, temp)
	p.done(func() {
		g.Store(sum, g.Return("sum"))
		g.Store(slope, g.Return("slope"))
	})
}

// lanes2 adds the second lane of x to the first.
func (v *vector) lanes2(x, temp reg.Register) {
	v.VUNPCKHPD(x, x, temp)
	v.VADDSD(temp, x, x)
}

func (g *generator) secularQuotients(s isa, squares bool) {
	p := g.poles(s, "secularQuotients"+squaresName(squares), squares)
	other := s.regs[12]
	p.spread("other", other)
	p.loop(2, func(i, at int, masked bool) {
		x, y, q, temp := s.regs[4*i], s.regs[1+4*i], s.regs[2+4*i], s.regs[3+4*i]
		p.load(p.x, at, masked, x)
		p.gap(x, q, temp)
		p.VSUBPD(other, x, y)
		if squares {
			p.VADDPD(other, x, temp)
			p.VMULPD(temp, y, y)
		}
		p.VDIVPD(y, q, q)
		p.load(p.y, at, masked, y)
		p.VMULPD(q, y, y)
		p.store(y, p.y, at, masked)
	})
	p.done(nil)
}

func (g *generator) secularRow(s isa, squares, left bool) {
	name := "secularRow" + squaresName(squares)
	if left {
		name = "secularRowLeft"
	}
	p := g.poles(s, name, squares)
	p.also = g.parameter("out")
	sums := s.regs[0:2]
	p.clear(sums...)
	p.loop(2, func(i, at int, masked bool) {
		x, z, q, temp := s.regs[2+4*i], s.regs[3+4*i], s.regs[4+4*i], s.regs[5+4*i]
		p.load(p.x, at, masked, x)
		p.load(p.y, at, masked, z)
		p.gap(x, q, temp)
		if left {
			p.VMULPD(x, z, z)
		}
		p.divide(z, q, q, masked)
		p.VFMADD231PD(q, q, sums[i])
		p.store(q, p.also, at, masked)
	})
	p.total(sums, s.regs[2])
	p.lanes2(sums[0].AsX(), s.regs[2].AsX())
	p.done(func() { g.Store(sums[0].AsX(), g.ReturnIndex(0)) })
}
