package xyz_test

import (
	"fmt"
	"strings"

	"ledgework/terrain"
	"ledgework/terrain/xyz"
)

func Example() {
	text := "Easting;Northing;Height;Intensity\n500010.5;4000020;30;17\n"
	r, err := xyz.NewReader(strings.NewReader(text), int64(len(text)), xyz.Options{})
	if err != nil {
		fmt.Println(err)
		return
	}
	b := terrain.NewBatch(terrain.BatchPoints, terrain.Intensity)
	if err := r.Read(b); err != nil {
		fmt.Println(err)
		return
	}
	fmt.Println(r.Header().Format, b.X, b.Y, b.Z, b.Intensity)
	// Output: CSV text [500010.5] [4.00002e+06] [30] [17]
}

// Numbers with decimal commas are refused, with what to do.
func ExampleNewReader() {
	text := "1,5;2,5;3,5\n"
	_, err := xyz.NewReader(strings.NewReader(text), int64(len(text)), xyz.Options{})
	fmt.Println(err)
	// Output: xyz: line 1: "1,5" is no number; write the numbers with decimal points
}
