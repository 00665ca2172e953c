// Command _asm writes the assembly kernels of package dense. It reads the declarations (argument structures, stubs) from the Go
// files beside the output, so that offsets cannot disagree.
package main

import (
	"fmt"
	"go/ast"
	"go/parser"
	"go/token"
	"go/types"
	"log"
	"os"

	"github.com/mmcloughlin/avo/attr"
	"github.com/mmcloughlin/avo/build"
	"github.com/mmcloughlin/avo/gotypes"
	"github.com/mmcloughlin/avo/operand"
	"github.com/mmcloughlin/avo/pass"
	"github.com/mmcloughlin/avo/printer"
	"github.com/mmcloughlin/avo/reg"
)

func main() {
	log.SetFlags(0)
	tiles := declarations("../tilecall.go", "../tile_amd64.go")
	write("../tile_avx512_amd64.s", tiles, func(g *generator) {
		for nv := 1; nv <= 3; nv++ {
			g.tiles(avx512, false, 8, nv)
		}
		for nv := 1; nv <= 3; nv++ {
			g.tiles(avx512, true, 4, nv)
		}
		g.packs(avx512)
	})
	write("../dots_avx512_amd64.s", tiles, func(g *generator) {
		for columns := 1; columns <= 4; columns++ {
			g.dots(avx512, false, 4, columns)
		}
		for columns := 1; columns <= 2; columns++ {
			g.dots(avx512, true, 4, columns)
		}
	})
	write("../dots_avx2_amd64.s", tiles, func(g *generator) {
		g.tailTable()
		for columns := 1; columns <= 4; columns++ {
			g.dots(avx2, false, 2, columns)
		}
		for columns := 1; columns <= 2; columns++ {
			g.dots(avx2, true, 2, columns)
		}
	})
	vectors := declarations("../vector_amd64.go")
	write("../vector_avx512_amd64.s", vectors, func(g *generator) { g.vectors(avx512) })
	write("../vector_avx2_amd64.s", vectors, func(g *generator) {
		g.tailTable()
		g.vectors(avx2)
	})
	halves := declarations("../symmetric_amd64.go")
	write("../symmetric_avx512_amd64.s", halves, func(g *generator) {
		g.symmetric(avx512, false)
		g.symmetric(avx512, true)
	})
	write("../symmetric_avx2_amd64.s", halves, func(g *generator) {
		g.tailTable()
		g.symmetric(avx2, false)
		g.symmetric(avx2, true)
	})
	equations := declarations("../secular_amd64.go")
	write("../secular_avx512_amd64.s", equations, func(g *generator) { g.secular(avx512) })
	write("../secular_avx2_amd64.s", equations, func(g *generator) {
		g.tailTable()
		g.secular(avx2)
	})
	write("../tile_avx2_amd64.s", tiles, func(g *generator) {
		g.tailTable()
		for nv := 1; nv <= 3; nv++ {
			g.tiles(avx2, false, 4, nv)
		}
		for nv := 1; nv <= 2; nv++ {
			g.tiles(avx2, true, 3, nv)
		}
		g.packs(avx2)
	})
}

// generator writes one file.
type generator struct {
	*build.Context
	declared *types.Package
	args     gotypes.Component // of the function in hand
	name     string
	labels   int
}

// tails is a table of which four lanes from 4-n on are a mask of n lanes.
func (g *generator) tails() operand.Mem {
	return operand.NewDataAddr(operand.Symbol{Name: "tails", Static: true}, 0)
}

func (g *generator) tailTable() {
	g.StaticGlobal("tails")
	g.DataAttributes(attr.RODATA | attr.NOPTR)
	for i := range 8 {
		g.AddDatum(8*i, operand.I64(-1+min(1, i/4)))
	}
}

func (g *generator) packs(s isa) {
	g.packRows(s)
	g.packColumns(s, false)
	g.packColumns(s, true)
}

// declarations type-checks Go files that import nothing and need the rest of the package in function bodies alone.
func declarations(paths ...string) *types.Package {
	set := token.NewFileSet()
	var files []*ast.File
	for _, path := range paths {
		file, err := parser.ParseFile(set, path, nil, 0)
		if err != nil {
			log.Fatal(err)
		}
		files = append(files, file)
	}
	config := types.Config{IgnoreFuncBodies: true}
	pkg, err := config.Check("rundle/internal/dense", set, files, nil)
	if err != nil {
		log.Fatal(err)
	}
	return pkg
}

// write runs body and puts what it generates into path.
func write(path string, declared *types.Package, body func(*generator)) {
	g := &generator{Context: build.NewContext(), declared: declared}
	g.ConstraintExpr("amd64,!purego")
	body(g)
	file, err := g.Result()
	if err != nil {
		build.LogError(log.Default(), err, 0)
		os.Exit(1)
	}
	if err := pass.Compile.Execute(file); err != nil {
		log.Fatal(err)
	}
	out, err := printer.NewGoAsm(printer.Config{Argv: []string{"(cd _asm && go run .)"}, Pkg: "dense"}).Print(file)
	if err != nil {
		log.Fatal(err)
	}
	if err := os.WriteFile(path, out, 0o666); err != nil {
		log.Fatal(err)
	}
}

// begin starts the function of that name, which must be declared.
func (g *generator) begin(name string) {
	sig, err := gotypes.LookupSignature(g.declared, name)
	if err != nil {
		log.Fatal(err)
	}
	g.Function(name)
	g.Attributes(attr.NOSPLIT)
	g.Signature(sig)
	g.name = name
}

// field returns the place of a field of the structure that p points to.
func (g *generator) field(name string, index ...int) operand.Mem {
	f := g.args.Field(name)
	if len(index) > 0 {
		f = f.Index(index[0])
	}
	at, err := f.Resolve()
	if err != nil {
		log.Fatalf("%s: %s: %v", g.name, name, err)
	}
	return at.Addr
}

// load brings a field into a new register.
func (g *generator) load(name string) reg.GPVirtual {
	r := g.GP64()
	g.MOVQ(g.field(name), r)
	return r
}

func (g *generator) label(stem string) string {
	g.labels++
	return fmt.Sprintf("%s%d", stem, g.labels)
}

// isa is a vector instruction set.
type isa struct {
	name  string
	bytes int // of a vector
	regs  []reg.VecPhysical
}

func (s isa) lanes() int { return s.bytes / 8 }

var avx512 = isa{"512", 64, []reg.VecPhysical{
	reg.Z0, reg.Z1, reg.Z2, reg.Z3, reg.Z4, reg.Z5, reg.Z6, reg.Z7, reg.Z8, reg.Z9, reg.Z10, reg.Z11, reg.Z12, reg.Z13, reg.Z14, reg.Z15,
	reg.Z16, reg.Z17, reg.Z18, reg.Z19, reg.Z20, reg.Z21, reg.Z22, reg.Z23, reg.Z24, reg.Z25, reg.Z26, reg.Z27, reg.Z28, reg.Z29, reg.Z30, reg.Z31,
}}

var avx2 = isa{"256", 32, []reg.VecPhysical{
	reg.Y0, reg.Y1, reg.Y2, reg.Y3, reg.Y4, reg.Y5, reg.Y6, reg.Y7, reg.Y8, reg.Y9, reg.Y10, reg.Y11, reg.Y12, reg.Y13, reg.Y14, reg.Y15,
}}
