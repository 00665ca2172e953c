// Package entanglement reads the entanglement of a matrix-product state: entropies and spectra, with charges, at every cut.
//
// Cut b lies after site b, counting from 0, in rung-major site order. Entropies are in nats. The entanglement spectrum is
// xi = -ln(lambda^2) with lambda the normalized Schmidt values (Li, Haldane 2008). Charges are those of the sites left of the
// cut, in the user's units. Of fermions and whatever else the site order strings together, the entanglement is that of the ordered modes.
//
// [Cuts] goes through the chain once; the state need not be normalized and does not change. Levels that come from rounding lie at xi of about
// 70 and beyond.
package entanglement
