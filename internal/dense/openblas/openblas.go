//go:build netlib

package openblas

/*
// Other libraries do not have these.
void openblas_set_num_threads(int) __attribute__((weak));
char *openblas_get_corename(void) __attribute__((weak));
static void one_thread(void) { if (openblas_set_num_threads) openblas_set_num_threads(1); }
static char *core(void) { return openblas_get_corename ? openblas_get_corename() : ""; }
*/
import "C"

// OneThread keeps the library from starting threads of its own.
func OneThread() { C.one_thread() }

// Core names the processor that the library takes this one for; empty if the library is not OpenBLAS.
func Core() string { return C.GoString(C.core()) }
