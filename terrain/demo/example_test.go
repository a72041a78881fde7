package demo_test

import (
	"context"
	"fmt"

	"ledgework/terrain"
	"ledgework/terrain/demo"
)

// A small scan of the first season, and what there is to find.
func Example() {
	season := demo.NewSite(1).Season(1)
	extent := terrain.EmptyExtent()
	err := season.Scan(context.Background(), demo.ScanOptions{Points: 20_000, Strays: -1}, 2, func(b *terrain.Batch) error {
		for i := range b.X {
			extent.Add(b.X[i], b.Y[i], b.Z[i])
		}
		return nil
	})
	if err != nil {
		fmt.Println(err)
		return
	}
	fmt.Printf("%d stations, ground from %.0f m to %.0f m\n", len(season.Stations()), extent.Min[2], extent.Max[2])
	o := season.Truth().Obstacles[0]
	fmt.Printf("%s: %s, %.2f m high, %.1f m²\n", o.Name, o.Kind, o.HeightM, o.AreaM2)
	// Output:
	// 5 stations, ground from 6 m to 33 m
	// Prow: bulge, 0.60 m high, 4.4 m²
}
