// Package mps holds matrix-product states: their forms, sums, truncations, spectra and files.
//
// # Chain and State
//
// A Chain is the expert's level: site tensors of known arithmetic, real or complex. A State is what the rest of the program hands around:
// a chain of either arithmetic together with the frames its local bases are written in and the scope that gives formulas their
// meaning. Functions that take a State switch once per call; ChainOf leads from it to the numbers.
//
// # Conventions
//
// A site tensor has the axes left bond (In), site (In), right bond (Out), and total charge zero: q(left) + q(site) = q(right). So a
// bond carries the charge of all sites to its left. The left edge is one state of charge zero, the right edge one state of the
// total charge, the sector of the state. Cut b lies after site b, counting from 0, and there are Len()-1 cuts. Basis states of a site
// count in the order of its axis, which is sorted by charge; ProductState counts in the user's order instead.
//
// A chain has an orthogonality centre or an unknown one (Center = -1). Left of the centre all tensors are isometries from the left, right
// of it from the right, so the norm of the state is that of one tensor, and a cut there is the best possible (Schollwoeck 2011,
// sections 4.4 and 4.5). States need not be normalized: Norm says, Normalize makes them, Truncate loses what it reports. Schmidt values
// are normalized always.
//
// Numbers far from one do not overflow on the way: factors 2^n are kept apart until the end, without rounding.
//
// # Ownership
//
// A chain owns its tensors; structures and axes are shared freely. Functions that regauge a chain replace its tensors and never write
// into the old ones; Scale and Normalize write in place. NewChain and NewReal or NewComplex keep what they are given. Zero values of
// Chain and State are of no use. Neither is for concurrent writing; concurrent reading is fine (Norm, Overlap, Schmidt, Save do not
// change anything).
//
// # Panics and errors
//
// What may come from a file or a user's number is an error: states that a site does not have, charges that cannot be reached, site tensors that
// do not fit, damaged files. Chains that live on different sites, sites and cuts out of range are mistakes in the program and panic with
// both shapes. A zero state has no Schmidt values: block.ErrZero.
//
// # Files
//
// Save writes an .npz archive that NumPy opens (package internal/npz), whole or not at all. Integers are counted from 0. With D
// charges and L sites it holds
//
//	meta                  JSON: format ("rundle-state/1"), arithmetic ("real" or "complex"), sites (L), center, group (names and moduli of the
//	                      charges), frames, scope, digest (npz.Writer.Digest of the other arrays)
//	bond_0000 .. bond_L   sectors × (1+D) int64: a row for each sector of the bond left of that site (bond_L: right edge), its dimension and its charges
//	site_0003/axis        the same table for the states of site 3
//	site_0003/blocks      blocks × 3 int64: rows of bond_0003, site_0003/axis and bond_0004 that each block belongs to
//	site_0003/block_0002  float64 or complex128, left × site × right: the block of row 2
//
// The full tensor of a site:
//
//	import json, numpy
//
//	d = numpy.load("state.npz")
//	meta = json.loads(str(d["meta"]))
//
//	def tensor(i):
//	    tables = d[f"bond_{i:04d}"], d[f"site_{i:04d}/axis"], d[f"bond_{i+1:04d}"]
//	    ends = [numpy.cumsum(t[:, 0]) for t in tables]
//	    out = numpy.zeros([e[-1] for e in ends], float if meta["arithmetic"] == "real" else complex)
//	    for k, rows in enumerate(d[f"site_{i:04d}/blocks"]):
//	        block = d[f"site_{i:04d}/block_{k:04d}"]
//	        out[tuple(slice(e[r] - n, e[r]) for e, r, n in zip(ends, rows, block.shape))] = block
//	    return out
//
// The stored states of a site are those of its frame: see meta["frames"]. Load refuses a file whose bytes have changed, that lacks
// something, or whose parts do not fit together, and says which.
//
// # Papers
//
//   - U. Schollwoeck, Ann. Phys. 326, 96 (2011): canonical forms, truncation, sums, overlaps.
//   - G. Vidal, Phys. Rev. Lett. 91, 147902 (2003): Schmidt values along a chain.
package mps
