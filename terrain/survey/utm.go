package survey

import (
	"fmt"
	"math"
)

// utmFor returns the EPSG code of the UTM zone, or beyond its limits the polar
// stereographic grid (UPS), of a place in degrees, on the datum that the
// geographic CRS with the EPSG code from refers to where that datum has UTM
// zones of its own at that place, else on WGS 84. Zones follow the military
// grid with its exceptions for south-west Norway and Svalbard (NGA.SIG.0012,
// "The Universal Grids").
func utmFor(lon, lat float64, from string) string {
	switch {
	case lat >= 84:
		return "EPSG:5041" // WGS 84 / UPS North (E,N)
	case lat < -80:
		return "EPSG:5042" // WGS 84 / UPS South (E,N)
	}
	zone := utmZone(lon, lat)
	north := lat >= 0
	// base + zone is the code of a zone on the same datum (EPSG data set).
	switch {
	case from == "EPSG:4258" && north && zone >= 28 && zone <= 38:
		return fmt.Sprintf("EPSG:%d", 25800+zone) // ETRS89
	case from == "EPSG:4269" && north && zone >= 1 && zone <= 23:
		return fmt.Sprintf("EPSG:%d", 26900+zone) // NAD83
	case from == "EPSG:4283" && !north && zone >= 49 && zone <= 56:
		return fmt.Sprintf("EPSG:%d", 28300+zone) // GDA94
	case from == "EPSG:7844" && !north && zone >= 49 && zone <= 56:
		return fmt.Sprintf("EPSG:%d", 7800+zone) // GDA2020
	case north:
		return fmt.Sprintf("EPSG:%d", 32600+zone)
	}
	return fmt.Sprintf("EPSG:%d", 32700+zone)
}

// utmZone returns the zone number 1..60 of a place in degrees.
func utmZone(lon, lat float64) int {
	lon = math.Mod(math.Mod(lon+180, 360)+360, 360) - 180
	zone := min(int(math.Floor((lon+180)/6))+1, 60)
	switch {
	case lat >= 56 && lat < 64 && lon >= 3 && lon < 12:
		zone = 32
	case lat >= 72 && lat < 84 && lon >= 0 && lon < 42:
		switch {
		case lon < 9:
			zone = 31
		case lon < 21:
			zone = 33
		case lon < 33:
			zone = 35
		default:
			zone = 37
		}
	}
	return zone
}
