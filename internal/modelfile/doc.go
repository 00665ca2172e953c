// Package modelfile reads a model file, TOML, into a checked Hamiltonian with its sector, settings and observations.
//
// A reader is strict: an unknown key, a wrong type, a symbol that nothing defines or a name used twice is an error. Every error
// names file, line and column (in characters), what was expected and the way out; a fault inside a formula is shown at its place in the
// file, even behind escapes in the string. All faults that can be told apart are reported together, in the order of the file: [Load]
// returns an errors.Join of [Error] values, which [Faults] takes apart. Nothing panics, whatever bytes the file holds.
//
// # Sections
//
//	title      = "..."
//	[ladder]   rungs; boundary, across = "open" | "periodic"
//	[[leg]]    name; site = "fermion" | "boson" | "spin" | "clock"; rungs = "0..rungs-2" or a list
//	           fermion: spin = "1/2" for two components, then double = false forbids double occupation
//	           boson: max; spin: s = "1/2"; clock: q
//	[constants]  NAME = number or formula of earlier constants
//	[profile]  NAME = formula, list of numbers, or { formula = "uniform(-W, W)", seed = 7 }
//	[[term]]   formula; name, each = { l = "legs" }, where
//	[sector]   CHARGE = number, "1/2" or a formula such as "rungs"
//	[solve]    precision, observable_precision, states, bond, sweeps, time = "2h30m", memory = "8 GiB", seed, charges = ["N"]
//	[[observe]]  see below
//
// A profile given as a list holds one number a rung, for h[j], or one a site in site order, for h[l,j].
//
// # Observations
//
//	[[observe]]                  # the expectation value of a formula at all its places
//	name    = "current"
//	formula = "i*J*(b^+[a,j+1] b[a,j] - h.c.)"
//	each    = { l = "legs" }     # if the formula has further indices
//	where   = "j > 3"
//
//	[[observe]]                  # <A_x B_y> for all pairs of places x of A and y of B
//	name = "coherence"
//	kind = "correlations"
//	of   = ["b^+[l,j]", "b[l,j]"]
//	each = { l = "legs" }        # each operator runs over its own indices; where applies to both
//	connected = true             # <A_x B_y> - <A_x><B_y>; default false
//
//	[[observe]]                  # at most one: the entanglement that every result holds
//	kind = "entanglement"
//	spectrum_to = 40             # levels with xi = -ln(lambda^2) below this are written
//
// # Identity
//
// [Model.Hash] is the SHA-256 of [Model.Content], a list of all that determines a result: the ladder, the values of constants and
// profiles, the formulas in their printed form, the sector, the settings, the observations with their names. It does not change with
// comments, spacing, the order of keys, the title, the names of terms or the way a constant is written, nor with the caps on time and memory, so that
// a search that met one of those can go on under a larger one.
package modelfile
