// Package task hands out independent pieces of work to a few goroutines. It is the one place in the numeric core that starts any.
//
// A Pool is a number of threads, no more: workers start with each list of work that is large enough to pay for them and end with it,
// so that no goroutine outlives a call and a pool needs no closing; only between Hold and Release, around lists that follow each other
// closely, they stay. The caller takes part as worker 0. The zero value and a nil
// pool run everything serially.
//
// Who does which piece is a matter of chance, what is done is not: results are the same at any thread count as long as each piece
// writes to memory of its own and uses scratch memory by worker only for what does not outlast the piece. Sums over pieces
// belong to the caller, after Do, in the order of the pieces.
//
// A pool also carries a question whether to stop to those who run long pieces (Until): they get a pool anyway.
//
// A panic in a piece stops the handing out and is raised again in the caller, with the stack of the worker.
package task
