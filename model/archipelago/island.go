package archipelago

import (
	"bytes"
	_ "embed"
	"fmt"

	"towpath/model/grid"
)

//go:embed island.json
var island []byte

// Grid returns the tables of the isles' power network: six buses, seven lines of which three loops are closed, and
// three power stations.
func Grid() (*grid.Network, error) {
	n, err := grid.Read(bytes.NewReader(island))
	if err != nil {
		return nil, fmt.Errorf("the isles' grid: %w", err)
	}
	return n, nil
}

// gridCases returns the cheapest dispatch under a second-order and under a semidefinite relaxation. The first bound
// lies below the second.
func gridCases() ([]Case, error) {
	n, err := Grid()
	if err != nil {
		return nil, err
	}
	cones, err := grid.Relax(n, grid.SecondOrder)
	if err != nil {
		return nil, err
	}
	matrix, err := grid.Relax(n, grid.Semidefinite)
	if err != nil {
		return nil, err
	}
	return []Case{
		{ID: "grid-cones", Story: "The station asks what its power must cost at least: a quick bound from second-order cones.", Model: cones},
		{ID: "grid-matrix", Story: "The same question with the whole voltage matrix: a higher bound, often an operating point.", Model: matrix},
	}, nil
}
