// Package policy states which package of the module may import which, and the
// house style, as data. It has no behaviour at run time: its tests read the
// source tree and compare it with the tables here.
//
// A new package must get a line in Rules before the tests pass, so that the
// direction of the data path is a decision and not an accident.
package policy

// Rule is what one package's non-test code may import.
type Rule struct {
	// Package is the import path below the module; a path that ends in "/..."
	// stands for every package below it that has no line of its own.
	Package string
	// Inside are the module's packages that it may import, written in the
	// same way.
	Inside []string
	// Outside are the path prefixes of the third-party modules it may import.
	Outside []string
	// Machine says that it may reach the machine it runs on: files,
	// environment, flags, logging, network, processes. Numerics may not.
	Machine bool
}

// Third-party modules, by the job they are here for.
const (
	linearAlgebra = "gonum.org/v1/gonum"
	settings      = "github.com/spf13/viper"
	decoding      = "github.com/go-viper/mapstructure"
	yaml          = "go.yaml.in/yaml"
	arrays        = "github.com/sbinet/npyio"
	commandLine   = "github.com/spf13/cobra"
	commandFlags  = "github.com/spf13/pflag"
	bar           = "github.com/schollz/progressbar"
	terminal      = "golang.org/x/term"
	processor     = "golang.org/x/sys/cpu"
	systemCalls   = "golang.org/x/sys/unix"
)

// Rules returns the table of allowed edges, in the order of the data path:
//
//	configs → hyperboloidal + grid → equations + source → evolve → extract → cmd
//
// Nothing numerical reads a case file or touches the machine; viper stays in
// configs and npyio in extract/store; only cmd/internal/wire sees both a case
// and numerical objects.
func Rules() []Rule {
	return []Rule{
		// A case as typed and as resolved; no physics object.
		{Package: "configs", Outside: []string{settings, decoding, yaml}, Machine: true},

		// The hole and the slicing; knows no stencil and no equation.
		{Package: "hyperboloidal", Outside: []string{linearAlgebra}},

		// Nodes, weights, steppers; know no hole.
		{Package: "grid", Inside: []string{"grid/stencil"}, Outside: []string{linearAlgebra}},
		{Package: "grid/stencil", Outside: []string{linearAlgebra}},
		{Package: "grid/march", Outside: []string{linearAlgebra, processor}},

		// Coefficients; the semi-discretisation; the driver's loop.
		{Package: "equations", Inside: []string{"hyperboloidal"}, Outside: []string{linearAlgebra}},
		{Package: "equations/semi", Inside: []string{"grid/...", "grid", "hyperboloidal", "equations"},
			Outside: []string{linearAlgebra, processor}},
		{Package: "equations/semi/...", Inside: []string{"grid/...", "grid"}, Outside: []string{linearAlgebra, processor}},
		{Package: "equations/evolve", Inside: []string{"grid/march"}, Outside: []string{linearAlgebra}},
		// Kerr: one evolution of one m from all of the above and the source, and
		// the second opinion, which has no grid.
		{Package: "equations/coupled", Inside: []string{"grid", "grid/...", "hyperboloidal", "equations", "equations/semi",
			"equations/evolve", "source", "source/worldline"}},
		{Package: "equations/frequency", Inside: []string{"hyperboloidal", "equations", "source", "source/worldline"},
			Outside: []string{linearAlgebra}},

		// The particle: its path knows no grid, its smoothed delta no evolution.
		{Package: "source", Inside: []string{"source/worldline", "grid", "grid/stencil", "hyperboloidal", "equations"}, Outside: []string{linearAlgebra}},
		{Package: "source/worldline", Inside: []string{"hyperboloidal"}, Outside: []string{linearAlgebra}},

		// From samples to certified numbers; knows nothing of how they evolved.
		{Package: "extract", Inside: []string{"extract/result"}, Outside: []string{linearAlgebra}},
		{Package: "extract/result"},
		{Package: "extract/...", Inside: []string{"extract", "extract/..."}, Outside: []string{linearAlgebra}},
		// Spheroidal modes need the equation's angular matrices and the hole.
		{Package: "extract/kerr", Inside: []string{"extract", "extract/...", "equations", "hyperboloidal"}, Outside: []string{linearAlgebra}},
		{Package: "extract/table", Machine: true}, // opens the files that others wrote
		{Package: "extract/compare", Inside: []string{"extract/result", "extract/table", "extract/flux"}, Outside: []string{linearAlgebra}},
		{Package: "extract/store", Inside: []string{"extract/result"}, Outside: []string{arrays, systemCalls}, Machine: true},
		{Package: "extract/report", Inside: []string{"extract/result"}},

		// The commands. Only wire turns a case into numerical objects; what
		// the commands show comes from the result's data types.
		{Package: "cmd/internal/policy"},
		{Package: "cmd/internal/wire", Inside: []string{"configs", "hyperboloidal", "grid", "grid/...", "equations",
			"equations/...", "source", "source/...", "extract", "extract/..."}, Outside: []string{linearAlgebra}, Machine: true},
		{Package: "cmd/internal/verify", Inside: []string{"configs", "extract/result"}},
		{Package: "cmd/internal/app", Inside: []string{"configs", "extract/result", "extract/store", "extract/report", "extract/compare",
			"equations/evolve", // its failure alone, which has an exit code
			"cmd/internal/wire", "cmd/internal/verify"},
			Outside: []string{commandLine, commandFlags, bar, terminal}, Machine: true},
		{Package: "cmd/faultymodel", Inside: []string{"hyperboloidal", "extract/result", "extract/compare", "extract/store", "extract/strain", "extract/flux"}, Machine: true},
		{Package: "cmd/nullmark", Inside: []string{"cmd/internal/app", "cmd/internal/wire"}, Machine: true},
	}
}

// MachinePackages returns the standard packages (and what lies below them)
// that only code marked Machine may import. io/fs and time are not among them:
// they carry types, and a clock that is read for a number in a result is
// caught by the tests that compare results bit for bit.
func MachinePackages() []string {
	return []string{"os", "log", "flag", "net", "syscall", "plugin", "expvar", "math/rand", "runtime/debug"}
}

// LongFile is a source file above the cap on lines, with the reason for it.
type LongFile struct{ Path, Reason string }

// MaxLines is the cap on the lines of a hand-written Go file.
const MaxLines = 600

// LongFiles returns the files that may exceed MaxLines.
func LongFiles() []LongFile {
	return nil
}
