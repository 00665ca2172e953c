// Package npz writes and reads NumPy's array files: .npy, one array, and .npz, a zip archive of named arrays.
//
// Arrays have shapes known only at run time and elements of one of five kinds: float64, complex128, int64, bool, and a single
// Unicode string (a zero-dimensional array), which carries metadata as JSON. In Python
//
//	d = numpy.load("file.npz")
//	d["energy"]                       # an array
//	json.loads(str(d["meta"]))        # metadata
//
// # Writing
//
// Everything is written little-endian in C order (the last index runs fastest), straight from the caller's memory, without
// compression: tensors of floating-point numbers do not compress, and a stored entry can be read at the speed of the disk. The
// zip directory holds a CRC-32 of every array. Entries and archives beyond 4 GiB and archives of more than 65535 arrays use
// zip64. The bytes depend on the arrays alone: no times, no names of users or machines. A Writer writes to any io.Writer; for a
// file that is whole or absent use it inside atomicfile.Write.
//
// # Reading
//
// Files come from elsewhere and may be damaged or foreign: whatever the bytes, reading ends in an array or an error that names the
// array and says what was expected, never in a panic. Memory is allocated as data arrive, not as a header promises. The reader accepts
// either byte order, C and Fortran order (always returned in C order), and compressed archives; kinds other than the five are an
// error. The checksum is verified when an array is read to its end, before the data are handed out.
//
// Slices belong to the caller, on both sides. A Writer is not for concurrent use; a Reader is.
//
// The formats are described in the NumPy enhancement proposal NEP 1 (Kern 2007) and in PKWARE's application note on zip.
package npz
