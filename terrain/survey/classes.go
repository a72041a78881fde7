package survey

import (
	"fmt"
	"strconv"
)

// className returns the number and name of a LAS class: "7 low noise". The
// names are those of the LAS specification 1.4 R16, tables 9 (point formats 0
// to 5, legacy) and 17 (6 to 10); they differ for 8 and 12 and from 13 on.
func className(class uint8, legacy bool) string {
	names := [...]string{
		"never classified", "unclassified", "ground", "low vegetation", "medium vegetation", "high vegetation",
		"building", "low noise", "reserved", "water", "rail", "road surface", "reserved", "wire guard",
		"wire conductor", "transmission tower", "wire connector", "bridge deck", "high noise",
		"overhead structure", "ignored ground", "snow", "temporal exclusion",
	}
	name := "reserved"
	switch {
	case class >= 64:
		name = "user defined"
	case legacy && class == 8:
		name = "model key-point"
	case legacy && class == 12:
		name = "overlap"
	case int(class) < len(names) && (!legacy || class < 13):
		name = names[class]
	}
	return strconv.Itoa(int(class)) + " " + name
}

// legacyClasses reports whether a format, as terrain.Header has it, is LAS with
// one of the point formats 0 to 5.
func legacyClasses(format string) bool {
	var minor, points int
	n, err := fmt.Sscanf(format, "LAS 1.%d, point format %d", &minor, &points)
	return err == nil && n == 2 && points <= 5
}
