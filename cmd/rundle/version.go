package main

import (
	"fmt"
	"runtime"
	"runtime/debug"

	"rundle/internal/dense"
)

// release is the version of the program.
const release = "0.1.0"

type versionCommand struct{}

// versionFacts are the JSON document of the command.
type versionFacts struct {
	Format   string `json:"format"`
	Version  string `json:"version"`
	Commit   string `json:"commit,omitempty"`
	Modified bool   `json:"modified,omitempty"`
	Go       string `json:"go"`
	System   string `json:"system"`
	Kernels  string `json:"kernels"`
	Threads  int    `json:"threads"`
}

func versionOf() versionFacts {
	kernels, _ := dense.Kernels()
	v := versionFacts{Format: "rundle-version/1", Version: release, Go: runtime.Version(), System: runtime.GOOS + "/" + runtime.GOARCH,
		Kernels: kernels, Threads: runtime.GOMAXPROCS(0)}
	info, ok := debug.ReadBuildInfo()
	if !ok {
		return v
	}
	for _, s := range info.Settings {
		switch s.Key {
		case "vcs.revision":
			v.Commit = s.Value
		case "vcs.modified":
			v.Modified = s.Value == "true"
		}
	}
	return v
}

// describeBuild is one line about the program.
func describeBuild() string {
	v := versionOf()
	line := "rundle " + v.Version
	if v.Commit != "" {
		line += fmt.Sprintf(" (%.12s", v.Commit)
		if v.Modified {
			line += ", modified"
		}
		line += ")"
	}
	return fmt.Sprintf("%s, %s, %s, kernels %s, %d threads", line, v.Go, v.System, v.Kernels, v.Threads)
}

func (versionCommand) run(c *console) (int, error) {
	if _, err := dense.Kernels(); err != nil {
		return 0, &usageError{err.Error(), ""}
	}
	if c.json {
		return exitDone, c.document(versionOf())
	}
	_, err := fmt.Fprintln(c.stdout, describeBuild())
	return exitDone, err
}
