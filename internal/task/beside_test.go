package task

import (
	"sync"
	"testing"

	"github.com/stretchr/testify/require"
)

func TestBeside(t *testing.T) {
	var both sync.WaitGroup
	both.Add(2)
	meet := func() { both.Done(); both.Wait() } // returns only if the two run at the same time
	Beside(meet, meet)

	ran := false
	require.PanicsWithValue(t, "main", func() { Beside(func() { ran = true }, func() { panic("main") }) })
	require.True(t, ran, "aside is waited for")
	defer func() {
		p, ok := recover().(*Panic)
		require.True(t, ok)
		require.Equal(t, "aside", p.Value)
		require.True(t, ran)
	}()
	ran = false
	Beside(func() { panic("aside") }, func() { ran = true })
}
