package main

import (
	"encoding/json"
	"errors"
	"fmt"
	"io"
	"runtime"
	"slices"
	"strings"

	"github.com/alecthomas/kong"

	"rundle/internal/modelfile"
)

// grammar is the command line.
type grammar struct {
	JSON    bool `name:"json" help:"Print one JSON document on standard output."`
	Threads *int `name:"threads" placeholder:"N" help:"Number of threads; default: all processors."`

	Check   checkCommand   `cmd:"" help:"Explain a model: unit cell, terms, charges, arithmetic, cost."`
	Solve   solveCommand   `cmd:"" help:"Find the ground state of a model, with observations and error bars, in a run folder."`
	Read    readCommand    `cmd:"" help:"Observe the states that a run saved."`
	Version versionCommand `cmd:"" help:"Print version, build and kernels."`
}

// commands lists what exists, in the order of the help.
var commands = []string{"check", "solve", "read", "version"}

// console is what a command talks to.
type console struct {
	stdout, stderr io.Writer
	json           bool
	threads        int
}

// runner is a command: it returns an exit code, or an error that decides it.
type runner interface {
	run(c *console) (int, error)
}

// run is the whole program but for the process around it.
func run(args []string, stdout, stderr io.Writer) int {
	c := &console{stdout: stdout, stderr: stderr, json: slices.Contains(args, "--json")}
	return c.finish(guard(stderr, func() (int, error) { return c.dispatch(args) }))
}

// finish tells of an error and returns the exit code. A panic has been told of already.
func (c *console) finish(code int, err error) int {
	if err == nil {
		return code
	}
	if code == exitDone {
		code = codeOf(err)
		c.diagnose(err)
	}
	if c.json {
		c.documentError(code, err)
	}
	return code
}

// dispatch parses the command line and runs the command.
func (c *console) dispatch(args []string) (int, error) {
	if len(args) == 0 {
		fmt.Fprint(c.stdout, welcome)
		return exitDone, nil
	}
	var g grammar
	helped := false
	parser, err := kong.New(&g,
		kong.Name("rundle"), kong.Description("From a ladder Hamiltonian in a model file to its ground state."),
		kong.Writers(c.stdout, c.stderr), kong.Exit(func(int) { helped = true }),
		kong.ConfigureHelp(kong.HelpOptions{Compact: true, NoExpandSubcommands: true}))
	if err != nil {
		return 0, err
	}
	parsed, err := parser.Parse(args)
	if helped {
		return exitDone, nil
	}
	if err != nil {
		return 0, usageOf(err, args)
	}
	threads := 0
	if g.Threads != nil {
		threads = *g.Threads
	}
	if g.Threads != nil && (threads < 1 || threads > 4096) {
		return 0, &usageError{fmt.Sprintf("--threads %d: expected 1 to 4096", threads), ""}
	}
	if threads > 0 {
		runtime.GOMAXPROCS(threads)
	}
	c.json, c.threads = g.JSON, threads
	return parsed.Selected().Target.Addr().Interface().(runner).run(c)
}

// usageOf words an error of the parser.
func usageOf(err error, args []string) error {
	var parse *kong.ParseError
	if errors.As(err, &parse) && parse.Context != nil && parse.Context.Selected() != nil {
		return &usageError{err.Error(), fmt.Sprintf("rundle %s --help lists its arguments and flags", parse.Context.Selected().Name)}
	}
	if word, ok := strings.CutPrefix(err.Error(), "unexpected argument "); ok {
		// The parser may add a guess; the word itself is among the arguments.
		for _, a := range args {
			if strings.HasPrefix(word, a) {
				return &usageError{fmt.Sprintf("unknown command %q", a), unknownHint(a)}
			}
		}
	}
	return &usageError{err.Error(), "rundle --help lists commands and flags"}
}

func unknownHint(word string) string {
	hint := "there are " + strings.Join(commands[:len(commands)-1], ", ") + " and " + commands[len(commands)-1]
	if strings.HasSuffix(word, ".toml") {
		hint += "; to solve a model: rundle solve " + word
	}
	return hint
}

// load reads a model file.
func load(file string) (*modelfile.Model, error) {
	m, err := modelfile.Load(file)
	if err != nil && len(modelfile.Faults(err)) == 0 {
		return nil, &usageError{err.Error(), ""}
	}
	return m, err
}

// document prints a value as the one JSON document of a command.
func (c *console) document(v any) error {
	e := json.NewEncoder(c.stdout)
	e.SetEscapeHTML(false)
	e.SetIndent("", " ")
	return e.Encode(v)
}

func (c *console) say(format string, args ...any) { fmt.Fprintf(c.stderr, format+"\n", args...) }
