package mps

import (
	"fmt"

	"rundle/mps/block"
)

// ExpectedBonds returns the len(axes)+1 bond axes (In) that a state of total charge total and bond dimension bond is likely to have: the bond states
// of each cut are shared among its charges in proportion to the configurations that pass through them, none more than the sites on either
// side can fill. It serves forecasts of cost and random states. A total that the sites cannot hold is an error.
func ExpectedBonds(g block.Group, axes []block.Axis, total block.Charge, bond int) ([]block.Axis, error) {
	if bond < 1 {
		return nil, fmt.Errorf("mps: bond dimension %d; expected at least 1", bond)
	}
	// Charges far from even filling carry few configurations: some thousand of the nearest are enough.
	layers, err := sectorLayers(g, axes, g.Normalize(total), bond, max(512, 4*bond))
	if err != nil {
		return nil, err
	}
	return bondSectors(g, axes, layers, bond), nil
}
