package grid

import "fmt"

// Options say how a grid is read. The zero value is the default.
type Options struct {
	// Band is the number of the band that holds the elevation, counted from
	// 1. The default is 0: the only band, or else the one whose name or unit
	// says elevation, or else the first, which a note in the header then says.
	Band int

	// CRS takes the place of the file's own in what unit heights are delivered
	// in: EPSG:n, WKT or PROJJSON. The default is the file's own. The header
	// keeps the latter.
	CRS string
}

// Validate checks the options.
func (o Options) Validate() error {
	if o.Band < 0 {
		return fmt.Errorf("grid: band %d: bands are counted from 1, and 0 chooses", o.Band)
	}
	return nil
}
