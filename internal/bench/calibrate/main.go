package main

import (
	"context"
	"encoding/json"
	"errors"
	"flag"
	"fmt"
	"io"
	"os"
	"os/signal"
	"regexp"

	"rundle/internal/calibration"
	"rundle/internal/task"
)

func main() {
	ctx, stop := signal.NotifyContext(context.Background(), os.Interrupt)
	defer stop()
	err := run(ctx, os.Args[1:], os.Stdout)
	if errors.Is(err, flag.ErrHelp) {
		return
	}
	if err != nil {
		fmt.Fprintln(os.Stderr, "calibrate:", err)
		os.Exit(1)
	}
}

func run(ctx context.Context, args []string, w io.Writer) error {
	flag := flag.NewFlagSet("calibrate", flag.ContinueOnError)
	asJSON := flag.Bool("json", false, "print one JSON object a model instead of the tables")
	detail := flag.Bool("detail", false, "a row for every model before the summary")
	misses := flag.Bool("misses", false, "list the searches whose energy is off by more than quoted")
	only := flag.String("only", "", "only the models whose name matches this regular `expression`")
	markdown := flag.Bool("markdown", false, "print results.md: what is met, the summary, a row for every model")
	from := flag.String("from", "", "do not search, read what --json has printed into this `file`")
	half := flag.String("half", "", "only the models of this `half`: tuning, test or held back")
	threads := flag.Int("threads", 2, "models at a time")
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
	var models []calibration.Model
	for _, m := range calibration.Models() {
		if match.MatchString(m.Name) && (*half == "" || *half == m.Half()) {
			models = append(models, m)
		}
	}
	if len(models) == 0 {
		return fmt.Errorf("--only %q, --half %q: no such model", *only, *half)
	}
	var records []calibration.Record
	if *from != "" {
		records, err = read(*from, models)
	} else {
		records, err = measure(ctx, models, *threads)
	}
	if err != nil {
		return err
	}
	if *asJSON {
		for i := range records {
			if err := json.NewEncoder(w).Encode(&records[i]); err != nil {
				return err
			}
		}
		return nil
	}
	if *markdown {
		page(w, records)
		return nil
	}
	if *detail {
		detailed(w, records).Render()
	}
	if *misses {
		missed(w, records)
	}
	summary(w, records).Render()
	return nil
}

// measure searches all models, several at a time.
func measure(ctx context.Context, models []calibration.Model, threads int) ([]calibration.Record, error) {
	records, failed := make([]calibration.Record, len(models)), make([]error, len(models))
	task.New(threads).Do(len(models), enough, func(_, i int) {
		if failed[i] = ctx.Err(); failed[i] == nil {
			records[i], failed[i] = models[i].Measure(ctx)
		}
	})
	return records, errors.Join(failed...)
}

// enough is more work than the pool asks for before it takes a second worker.
const enough = 1e12

// read takes the records of the models from a file.
func read(name string, models []calibration.Model) ([]calibration.Record, error) {
	f, err := os.Open(name)
	if err != nil {
		return nil, err
	}
	defer f.Close()
	found := map[string]calibration.Record{}
	for d := json.NewDecoder(f); ; {
		var r calibration.Record
		if err := d.Decode(&r); err == io.EOF {
			break
		} else if err != nil {
			return nil, fmt.Errorf("%s: %w", name, err)
		}
		found[r.Name] = r
	}
	records := make([]calibration.Record, len(models))
	for i, m := range models {
		r, ok := found[m.Name]
		if !ok {
			return nil, fmt.Errorf("%s: no record of %q; search anew", name, m.Name)
		}
		records[i] = r
	}
	return records, nil
}
