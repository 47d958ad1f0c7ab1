package wire

import (
	"fmt"
	"os"

	"nullmark/configs"
	"nullmark/extract/table"
	"nullmark/source/worldline"
)

// driveOf reads what drives an inspiral: the published post-Newtonian flux, or a
// table of circular fluxes in the columns orbit.radius, energy_infinity and
// energy_horizon.
func driveOf(drive string) (worldline.Flux, error) {
	if drive == configs.DrivePN {
		return worldline.PostNewtonian{}, nil
	}
	f, err := os.Open(drive)
	if err != nil {
		return nil, fmt.Errorf("orbit.drive: %w", err)
	}
	defer f.Close()
	t, err := table.Open(drive)
	if err != nil {
		return nil, fmt.Errorf("orbit.drive: %w", err)
	}
	defer t.Close()
	var cols [3][]float64
	for i, name := range []string{"orbit.radius", "energy_infinity", "energy_horizon"} {
		if cols[i], err = t.Real(name); err != nil {
			return nil, fmt.Errorf("orbit.drive: %w", err)
		}
	}
	return worldline.NewFluxTable(cols[0], cols[1], cols[2])
}
