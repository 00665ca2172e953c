package runfolder

import (
	"fmt"
	"os"
	"os/exec"
	"os/signal"
	"path/filepath"
	"syscall"
	"testing"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"
)

// The test binary called again with this variable set writes into the folder
// it names while the system refuses files longer than a few bytes.
const fullDisk = "RUNDLE_TEST_FULL_DISK"

func TestMain(m *testing.M) {
	if dir := os.Getenv(fullDisk); dir != "" {
		os.Exit(writeOnFullDisk(dir))
	}
	os.Exit(m.Run())
}

func writeOnFullDisk(dir string) int {
	signal.Ignore(syscall.SIGXFSZ)
	f, err := Open(dir, model, Options{})
	if err != nil {
		fmt.Println("open:", err)
		return 3
	}
	if err := syscall.Setrlimit(syscall.RLIMIT_FSIZE, &syscall.Rlimit{Cur: 100, Max: 100}); err != nil {
		fmt.Println("limit:", err)
		return 3
	}
	r := sample()
	r.States[0].Energy = -99
	fmt.Println("result:", f.WriteResult(r))
	fmt.Println("log:", f.Log(Sweep{Note: "a note that makes the line longer than a hundred bytes by itself, whatever the numbers are"}))
	fmt.Println("close:", f.Close())
	return 0
}

// TestFullDisk: results and log that exist stay whole when the disk is full.
func TestFullDisk(t *testing.T) {
	dir := filepath.Join(t.TempDir(), "vortex.run")
	finish(t, dir, model)
	f, err := Open(dir, model, Options{})
	require.NoError(t, err)
	require.NoError(t, f.Log(Sweep{Sweep: 1}))
	require.NoError(t, f.Close())
	require.NoError(t, os.Remove(StatePath(dir, 0))) // not Finished: the run writes again
	before, err := os.ReadFile(filepath.Join(dir, ResultFile))
	require.NoError(t, err)

	command := exec.Command(os.Args[0])
	command.Env = append(os.Environ(), fullDisk+"="+dir)
	out, err := command.CombinedOutput()
	require.NoError(t, err, string(out))
	assert.Contains(t, string(out), "result: run folder "+dir)
	assert.Contains(t, string(out), "file too large; existing results are intact")
	assert.Contains(t, string(out), "log: run folder "+dir)
	assert.Contains(t, string(out), "close: <nil>")

	after, err := os.ReadFile(filepath.Join(dir, ResultFile))
	require.NoError(t, err)
	assert.Equal(t, string(before), string(after))
	f = open(t, dir, model, Options{})
	require.NoError(t, f.Log(Sweep{Sweep: 2}))
	sweeps, err := ReadLog(dir)
	require.NoError(t, err)
	assert.Equal(t, []Sweep{{Sweep: 1}, {Sweep: 2}}, sweeps)
}
