package arch

// layers lists the packages from the top down, by their path within the
// module. Imports go down; packages on one line do not import each other.
// A trailing "/..." takes in the packages below.
var layers = [][]string{
	{"examples/...", "internal/bench/...", "internal/acceptance"},
	{"internal/calibration"},
	{"cmd/rundle"},
	{"internal/report"},
	{"internal/survey"},
	{"internal/solve"},
	{"internal/runfolder"},
	{"internal/modelfile"},
	{"observables", "entanglement"},
	{"dmrg"},
	{"mpo"},
	{"mps"},
	{"mpo/ladder/rewrite", "mpo/ladder/bands", "mpo/ladder/effective"},
	{"mpo/ladder"},
	{"mpo/ladder/formula"},
	{"mps/block"},
	{"observables/scaling"},
	{"internal/krylov"},
	{"internal/dense"},
	{"internal/dense/openblas"},
	{"internal/fit", "internal/errorbar", "internal/npz", "internal/atomicfile", "internal/task"},
	{"internal/arch", "internal/exact", "."},
}

// testOnly may be imported by test files alone, from any layer, and by judges, which measure the program and are no part of it.
var (
	testOnly = []string{"internal/exact"}
	judges   = []string{"internal/calibration"}
)

// core packages depend on the standard library and on coreModules; the numeric
// core starts no goroutine but through internal/task.
var (
	core = []string{
		"mps", "mps/block", "mpo", "mpo/ladder", "mpo/ladder/formula", "mpo/ladder/rewrite", "mpo/ladder/bands",
		"mpo/ladder/effective", "dmrg", "observables", "observables/scaling", "entanglement",
		"internal/dense", "internal/krylov", "internal/fit", "internal/npz", "internal/atomicfile", "internal/task",
	}
	coreModules = []string{"gonum.org/v1/gonum", "golang.org/x/sys"}
	starters    = []string{"internal/task"}
)

// netlib is the one module that a build tag adds, and the package that may.
const (
	netlibModule  = "gonum.org/v1/netlib"
	netlibPackage = "internal/dense"
)

// topLevel lists what may lie in the module's root. Names that start with a
// dot are free.
var topLevel = []string{
	"mps", "mpo", "dmrg", "observables", "entanglement", "cmd", "examples", "internal",
	"doc.go", "go.mod", "go.sum", "README.md", "DEVELOPERS.md", "LICENSE", "CHANGELOG.md",
}
