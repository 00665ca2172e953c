package exact

import "math"

// IsingChain is the ground energy of -sum X_j X_{j+1} - sum Z_j (Pauli
// matrices) on an open chain: 1 - 1/sin(pi/(4L+2)). Pfeuty 1970, from memory;
// checked here against free fermions and exact diagonalization.
func IsingChain(sites int) float64 {
	return 1 - 1/math.Sin(math.Pi/float64(4*sites+2))
}

// XXChain is the ground energy of sum (S^x S^x + S^y S^y) on an open chain of
// even length: 1/2 - 1/(2 sin(pi/(2L+2))). Lieb, Schultz, Mattis 1961.
func XXChain(sites int) float64 {
	return 0.5 - 1/(2*math.Sin(math.Pi/float64(2*sites+2)))
}

// PairingChain is the ground energy, in both parities, of
// sum (-t c_j^+ c_{j+1} + t c_j c_{j+1} + h.c.) on an open chain: -t (L-1).
// Kitaev 2001.
func PairingChain(sites int, t float64) float64 { return -t * float64(sites-1) }

// MajumdarGhoshChain is the ground energy of sum S_j . S_{j+1} + (1/2) sum
// S_j . S_{j+2}, spin 1/2, on an open chain of even length: -3/4 for every
// singlet. Majumdar, Ghosh 1969.
func MajumdarGhoshChain(sites int) float64 { return -3 * float64(sites) / 8 }

// AKLTChain is the fourfold ground energy of sum (S_j . S_{j+1} +
// (S_j . S_{j+1})^2 / 3), spin 1, on an open chain: -2/3 a link.
// Affleck, Kennedy, Lieb, Tasaki 1987.
func AKLTChain(sites int) float64 { return -2 * float64(sites-1) / 3 }

// HeisenbergDensity is the energy per site of the infinite spin-1/2 chain,
// 1/4 - ln 2. Hulthen 1938.
const HeisenbergDensity = 0.25 - math.Ln2

// ClockDensity is the energy per site of the infinite critical three-state
// chain -sum (Z_j^+ Z_{j+1} + X_j + h.c.): -(4/3 + 2 sqrt(3)/pi). Hamer 1981.
var ClockDensity = -(4.0/3 + 2*math.Sqrt(3)/math.Pi)

// MeissnerThreshold is the rung hopping above which bosons without interaction
// on the two-leg flux ladder condense at zero leg momentum (the Meissner
// state): K > 2 J tan(phi/2) sin(phi/2). Huegel, Paredes 2014.
func MeissnerThreshold(j, phi float64) float64 {
	return 2 * j * math.Tan(phi/2) * math.Sin(phi/2)
}
