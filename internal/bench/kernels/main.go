package main

import (
	"encoding/json"
	"errors"
	"flag"
	"fmt"
	"io"
	"os"
	"regexp"
	"slices"
	"strings"

	"rundle/internal/dense"
)

func main() {
	err := run(os.Args[1:], os.Stdout)
	if errors.Is(err, flag.ErrHelp) {
		return
	}
	if err != nil {
		fmt.Fprintln(os.Stderr, "kernels:", err)
		if errors.Is(err, errMissed) {
			os.Exit(3)
		}
		os.Exit(1)
	}
}

// errMissed is for --check.
var errMissed = errors.New("missed figures that were to be reached")

func run(args []string, w io.Writer) error {
	flag := flag.NewFlagSet("kernels", flag.ContinueOnError)
	asJSON := flag.Bool("json", false, "print one JSON object a line instead of the table")
	quick := flag.Bool("quick", false, "fewer sizes and rounds: under 40 seconds")
	only := flag.String("only", "", "measure only the rows whose name matches this regular `expression`")
	sets := flag.String("kernels", strings.Join(own(), ","), "Rundle's kernels to measure, by comma")
	core := flag.String("core", "", "the `processor` whose kernels OpenBLAS uses, such as Haswell for AVX2 (default: the best that runs)")
	check := flag.Bool("check", false, "end with code 3 if a figure that is to be reached is missed")
	if err := flag.Parse(args); err != nil {
		return err
	}
	if flag.NArg() > 0 {
		return fmt.Errorf("unexpected argument %q; see -help", flag.Arg(0))
	}
	match, err := regexp.Compile(*only)
	if err != nil {
		return fmt.Errorf("--only: %w", err)
	}
	if err := prepareReference(*core); err != nil {
		return err
	}
	names := strings.Split(*sets, ",")
	for _, name := range names {
		if err := dense.UseKernels(name); err != nil {
			return fmt.Errorf("--kernels: %w", err)
		}
	}
	var rows []row
	out := newTable(w, names)
	report := func(t task, fresh []row) error {
		rows = append(rows, fresh...)
		if !*asJSON {
			out.add(t, fresh)
			return nil
		}
		for _, r := range fresh {
			if err := json.NewEncoder(w).Encode(r); err != nil {
				return err
			}
		}
		return nil
	}
	for _, t := range tasks(*quick) {
		if match.MatchString(t.name()) {
			if err := report(t, t.measure(names, *quick)); err != nil {
				return err
			}
		}
	}
	if err := measureWorkers(names, match, *quick, report); err != nil {
		return err
	}
	if len(rows) == 0 {
		return fmt.Errorf("--only %q: no row of that name", *only)
	}
	summary := w
	if *asJSON {
		summary = io.Discard
	} else {
		out.end()
	}
	missed := summarize(summary, names, rows)
	if *check && missed > 0 {
		return fmt.Errorf("%w: %d", errMissed, missed)
	}
	return nil
}

// summarize judges the kernels that have the vectors of the reference, and returns how many figures are missed.
func summarize(w io.Writer, names []string, rows []row) (missed int) {
	for _, name := range names {
		narrow := name == "avx2"
		ours := slices.DeleteFunc(slices.Clone(rows), func(r row) bool {
			return r.Kernels != name || r.group != workers && narrow == wideReference()
		})
		if name == "go" || len(ours) == 0 {
			continue
		}
		missed += printVerdicts(w, "figures to reach, "+name, judge(ours, limits(narrow)))
	}
	return missed + printBytes(w, rows)
}

// own lists the kernels of this build that are Rundle's, best first.
func own() []string {
	var out []string
	for _, name := range []string{"avx512", "avx2", "go"} {
		if dense.UseKernels(name) == nil {
			out = append(out, name)
		}
	}
	if len(out) > 1 {
		out = out[:len(out)-1]
	}
	return out
}
