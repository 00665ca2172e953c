package main

import (
	"encoding/json"
	"errors"
	"flag"
	"fmt"
	"io"
	"os"
	"regexp"
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
		os.Exit(1)
	}
}

func run(args []string, w io.Writer) error {
	flag := flag.NewFlagSet("kernels", flag.ContinueOnError)
	asJSON := flag.Bool("json", false, "print one JSON object a line instead of the table")
	quick := flag.Bool("quick", false, "fewer sizes and rounds: under 40 seconds")
	only := flag.String("only", "", "measure only the rows whose name matches this regular `expression`")
	sets := flag.String("kernels", strings.Join(own(), ","), "Rundle's kernels to measure, by comma")
	core := flag.String("core", "", "the `processor` whose kernels OpenBLAS uses, such as Haswell for AVX2 (default: the best that runs)")
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
	for _, c := range tasks(*quick) {
		if !match.MatchString(c.name()) {
			continue
		}
		for _, r := range c.measure(names, *quick) {
			rows = append(rows, r)
			if *asJSON {
				if err := json.NewEncoder(w).Encode(r); err != nil {
					return err
				}
			}
		}
		if !*asJSON {
			out.add(c, rows[len(rows)-len(names):])
		}
	}
	if len(rows) == 0 {
		return fmt.Errorf("--only %q: no row of that name", *only)
	}
	if !*asJSON {
		out.end()
	}
	return nil
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
