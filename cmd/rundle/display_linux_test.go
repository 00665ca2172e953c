package main

import (
	"fmt"
	"io"
	"os"
	"testing"
	"time"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"
	"golang.org/x/sys/unix"

	"rundle/internal/solve"
)

// terminal opens a pseudo-terminal of the given height; all that is written to it is sent to the channel when it is closed.
func terminal(t *testing.T, height uint16) (tty *os.File, written <-chan string) {
	t.Helper()
	master, err := os.OpenFile("/dev/ptmx", os.O_RDWR|unix.O_NOCTTY, 0)
	if err != nil {
		t.Skip("no pseudo-terminals here:", err)
	}
	t.Cleanup(func() { master.Close() })
	fd := int(master.Fd())
	require.NoError(t, unix.IoctlSetPointerInt(fd, unix.TIOCSPTLCK, 0))
	number, err := unix.IoctlGetInt(fd, unix.TIOCGPTN)
	require.NoError(t, err)
	tty, err = os.OpenFile(fmt.Sprintf("/dev/pts/%d", number), os.O_RDWR|unix.O_NOCTTY, 0)
	require.NoError(t, err)
	require.NoError(t, unix.IoctlSetWinsize(int(tty.Fd()), unix.TIOCSWINSZ, &unix.Winsize{Row: height, Col: 120}))
	out := make(chan string, 1)
	go func() {
		text, _ := io.ReadAll(master) // ends with an error when the other side is closed
		out <- string(text)
	}()
	return tty, out
}

// TestBar: on a terminal there is a bar with the time left; it ends with the run.
func TestBar(t *testing.T) {
	tty, written := terminal(t, 30)
	d := newDisplay(tty)
	require.IsType(t, &bar{}, d)
	d.update(solve.Progress{Phase: solve.Preparing})
	for sweep := 1; sweep <= 3; sweep++ {
		for done := 1; done <= 10; done++ {
			d.update(solve.Progress{Phase: solve.Sweeping, Sweep: sweep, Done: done, Of: 10, Energy: -1.25})
		}
	}
	time.Sleep(3 * barRefresh)
	d.update(solve.Progress{Phase: solve.Observing})
	d.close()
	require.NoError(t, tty.Close())
	assert.Contains(t, <-written, "left of sweep 3, energy -1.25")

	tty, written = terminal(t, 30)
	newDisplay(tty).close() // a run that had nothing to do
	require.NoError(t, tty.Close())
	assert.Empty(t, <-written)
}

// TestFlatTerminal: where a terminal does not tell its size a bar would not be seen.
func TestFlatTerminal(t *testing.T) {
	tty, _ := terminal(t, 0)
	assert.IsType(t, &lines{}, newDisplay(tty))
	require.NoError(t, tty.Close())
}
