package main

import (
	"context"
	"encoding/json"
	"errors"
	"fmt"
	"io"
	"os"
	"os/signal"
	"regexp"
	"syscall"

	"github.com/alecthomas/kong"
)

// grammar is the command line.
type grammar struct {
	Baseline string `name:"baseline" placeholder:"DIR" help:"Folder of the NumPy solver, with bench.py."`
	Only     string `name:"only" placeholder:"EXPRESSION" help:"Measure only the rows whose name matches this regular expression."`
	List     bool   `name:"list" help:"List the rows and end."`
	Quick    bool   `name:"quick" help:"Small bond dimensions, one round: under two minutes."`
	Rounds   int    `name:"rounds" default:"3" help:"How often each row is measured, both in turns (default: ${default})."`
	Python   string `name:"python" default:"/usr/bin/python3" help:"The Python that has NumPy and SciPy (default: ${default})."`
	Core     string `name:"core" placeholder:"NAME" help:"Processor whose kernels OpenBLAS is to use, such as SkylakeX for AVX-512; default: the one that it recognizes."`
	JSON     bool   `name:"json" help:"Print one JSON object a row instead of the table."`
	Job      string `name:"job" hidden:"" help:"Do one measurement, as the command itself asks its children."`
}

func main() {
	ctx, stop := signal.NotifyContext(context.Background(), os.Interrupt, syscall.SIGTERM)
	defer stop()
	if err := run(ctx, os.Args[1:], os.Stdout, os.Stderr); err != nil {
		fmt.Fprintln(os.Stderr, "compare:", err)
		os.Exit(1)
	}
}

func run(ctx context.Context, args []string, stdout, stderr io.Writer) error {
	var g grammar
	ended := false
	parser, err := kong.New(&g, kong.Name("compare"), kong.Writers(stdout, stderr), kong.Exit(func(int) { ended = true }),
		kong.Description("Runs Rundle and a NumPy solver in turns and prints what one does in units of the other."))
	if err != nil {
		return err
	}
	if _, err := parser.Parse(args); err != nil || ended {
		return err
	}
	if g.Job != "" {
		return serve(ctx, g.Job, stdout)
	}
	rows := allRows(g.Quick)
	if g.List {
		for _, r := range rows {
			fmt.Fprintln(stdout, r.name())
		}
		return nil
	}
	if rows, err = matching(rows, g.Only); err != nil {
		return err
	}
	if g.Rounds < 1 {
		return fmt.Errorf("--rounds %d: want at least one", g.Rounds)
	}
	if g.Quick {
		g.Rounds = 1
	}
	l, err := newLab(g, stderr)
	if err != nil {
		return err
	}
	var lines []line
	for _, r := range rows {
		if l.baseline == "" && r.kind.compares() {
			return errors.New("--baseline DIR is needed for row " + r.name())
		}
		out, err := l.measure(ctx, r)
		if err != nil {
			return fmt.Errorf("row %q: %w", r.name(), err)
		}
		lines = append(lines, out)
		if g.JSON {
			if err := json.NewEncoder(stdout).Encode(out); err != nil {
				return err
			}
			continue
		}
		fmt.Fprintln(stderr, out)
	}
	if !g.JSON {
		fmt.Fprint(stdout, render(lines))
	}
	return nil
}

// matching picks the rows whose name matches.
func matching(rows []row, expression string) ([]row, error) {
	match, err := regexp.Compile(expression)
	if err != nil {
		return nil, fmt.Errorf("--only: %w", err)
	}
	var out []row
	for _, r := range rows {
		if match.MatchString(r.name()) {
			out = append(out, r)
		}
	}
	if len(out) == 0 {
		return nil, fmt.Errorf("--only %q: no row of that name; --list shows them", expression)
	}
	return out, nil
}
