package main

import (
	"bytes"
	"encoding/json"
	"errors"
	"flag"
	"io"
	"math/rand/v2"
	"os"
	"os/exec"
	"path/filepath"
	"strconv"
	"syscall"
	"testing"
	"time"

	"github.com/rogpeppe/go-internal/testscript"
)

// update rewrites the golden parts of the scripts: go test ./cmd/rundle -run Scripts -update.
var update = flag.Bool("update", false, "rewrite the golden parts of the scripts")

func TestMain(m *testing.M) {
	testscript.Main(m, map[string]func(){"rundle": main})
}

func TestScripts(t *testing.T) {
	examples, err := filepath.Abs("../../examples")
	if err != nil {
		t.Fatal(err)
	}
	python := pythonWithNumPy()
	testscript.Run(t, testscript.Params{
		Dir: "testdata/script",
		Setup: func(e *testscript.Env) error {
			e.Setenv("EXAMPLES", examples)
			e.Setenv("PYTHON", python)
			return nil
		},
		Condition: func(name string) (bool, error) {
			if name == "numpy" {
				return python != "", nil
			}
			return false, errors.New("unknown condition")
		},
		Cmds: map[string]func(*testscript.TestScript, bool, []string){
			"exits": exits, "interrupts": interrupts, "json": checkJSON, "noise": noise, "differs": differs,
		},
		UpdateScripts: *update,
	})
}

// pythonWithNumPy finds a Python that has NumPy, "" if there is none.
func pythonWithNumPy() string {
	for _, name := range []string{"python3", "/usr/bin/python3"} {
		path, err := exec.LookPath(name)
		if err == nil && exec.Command(path, "-c", "import numpy").Run() == nil {
			return path
		}
	}
	return ""
}

// exits CODE COMMAND ARG... runs a command and checks its exit code.
func exits(ts *testscript.TestScript, neg bool, args []string) {
	if neg || len(args) < 2 {
		ts.Fatalf("usage: exits CODE COMMAND ARG...")
	}
	checkCode(ts, args[0], ts.Exec(args[1], args[2:]...))
}

func checkCode(ts *testscript.TestScript, want string, err error) {
	code, convErr := strconv.Atoi(want)
	ts.Check(convErr)
	got := 0
	var exit *exec.ExitError
	switch {
	case errors.As(err, &exit):
		got = exit.ExitCode()
	case err != nil:
		ts.Fatalf("%v", err)
	}
	if got != code {
		ts.Fatalf("exit code %d, want %d", got, code)
	}
}

// sweeping tells whether a status is that of the process, at work with sweeps done.
func sweeping(text []byte, process int) bool {
	var s struct {
		Phase          string
		Process, Sweep int
	}
	return json.Unmarshal(text, &s) == nil && s.Phase == "running" && s.Process == process && s.Sweep > 0
}

// interrupts SIGNAL CODE DIR COMMAND ARG... runs a command, sends it a signal (int, term, kill) once its run folder DIR tells of sweeps done, and checks its
// exit code. Standard output goes to the file interrupted.out, standard error to interrupted.err.
func interrupts(ts *testscript.TestScript, neg bool, args []string) {
	if neg || len(args) < 4 {
		ts.Fatalf("usage: interrupts SIGNAL CODE DIR COMMAND ARG...")
	}
	signal := map[string]os.Signal{"int": os.Interrupt, "term": syscall.SIGTERM, "kill": os.Kill}[args[0]]
	program, err := exec.LookPath(args[3])
	ts.Check(err)
	command := exec.Command(program, args[4:]...)
	command.Dir = ts.MkAbs(".")
	var stdout, stderr bytes.Buffer
	command.Stdout, command.Stderr = &stdout, &stderr
	ts.Check(command.Start())
	ended := make(chan error, 1)
	go func() { ended <- command.Wait() }()
	status := ts.MkAbs(filepath.Join(args[2], "status.json"))
	deadline := time.Now().Add(time.Minute)
	for {
		text, _ := os.ReadFile(status)
		if sweeping(text, command.Process.Pid) {
			break
		}
		select {
		case err := <-ended:
			ts.Fatalf("it ended before it could be interrupted: %v\n%s%s", err, stdout.String(), stderr.String())
		case <-time.After(5 * time.Millisecond):
		}
		if time.Now().After(deadline) {
			_ = command.Process.Kill()
			ts.Fatalf("no sweep within a minute")
		}
	}
	ts.Check(command.Process.Signal(signal))
	err = <-ended
	ts.Check(os.WriteFile(ts.MkAbs("interrupted.out"), stdout.Bytes(), 0o666))
	ts.Check(os.WriteFile(ts.MkAbs("interrupted.err"), stderr.Bytes(), 0o666))
	checkCode(ts, args[1], err)
}

// json FILE checks that a file (or stdout) is exactly one JSON document.
func checkJSON(ts *testscript.TestScript, neg bool, args []string) {
	if neg || len(args) != 1 {
		ts.Fatalf("usage: json FILE")
	}
	d := json.NewDecoder(bytes.NewBufferString(ts.ReadFile(args[0])))
	var document map[string]any
	ts.Check(d.Decode(&document))
	if _, err := d.Token(); !errors.Is(err, io.EOF) {
		ts.Fatalf("%s: text after the document", args[0])
	}
	if format, _ := document["format"].(string); format == "" {
		ts.Fatalf("%s: no format", args[0])
	}
}

// noise FILE BYTES SEED writes random bytes.
func noise(ts *testscript.TestScript, neg bool, args []string) {
	if neg || len(args) != 3 {
		ts.Fatalf("usage: noise FILE BYTES SEED")
	}
	n, err := strconv.Atoi(args[1])
	ts.Check(err)
	seed, err := strconv.ParseUint(args[2], 10, 64)
	ts.Check(err)
	rng := rand.New(rand.NewPCG(seed, 0))
	data := make([]byte, n)
	for i := range data {
		data[i] = byte(rng.UintN(256))
	}
	ts.Check(os.WriteFile(ts.MkAbs(args[0]), data, 0o666))
}

// differs FILE FILE checks that two files are not the same.
func differs(ts *testscript.TestScript, neg bool, args []string) {
	if neg || len(args) != 2 {
		ts.Fatalf("usage: differs FILE FILE")
	}
	if ts.ReadFile(args[0]) == ts.ReadFile(args[1]) {
		ts.Fatalf("%s and %s are the same", args[0], args[1])
	}
}
