package main

import (
	"context"
	"fmt"
	"runtime"
	"runtime/debug"

	"github.com/spf13/cobra"

	"ledgework/terrain/gdal"
)

// A versionInfo says what was built from what, and what it runs on.
type versionInfo struct {
	Version  string `json:"version"`
	Revision string `json:"revision,omitempty"`
	Time     string `json:"time,omitempty"`
	Modified bool   `json:"modified,omitempty"`
	Go       string `json:"go"`
	Platform string `json:"platform"`
	GDAL     string `json:"gdal"`
}

func newVersionCommand(g *globals, term *terminal) *cobra.Command {
	return &cobra.Command{
		Use:   "version",
		Short: "Print the version",
		Args:  cobra.NoArgs,
		RunE: func(cmd *cobra.Command, _ []string) error {
			return runVersion(cmd.Context(), g, term)
		},
	}
}

func runVersion(_ context.Context, g *globals, term *terminal) error {
	v := buildVersion()
	if g.JSON {
		return writeJSON(term.out, v)
	}
	_, err := fmt.Fprintf(term.out, "ledgework %s, %s, %s, %s\n", v, v.Go, v.Platform, v.GDAL)
	return err
}

// String is the version with the revision that it was built from.
func (v versionInfo) String() string {
	s := v.Version
	if v.Revision != "" {
		s += ", revision " + v.Revision
	}
	if v.Modified {
		s += " (modified)"
	}
	return s
}

// buildVersion reads what the Go linker recorded.
func buildVersion() versionInfo {
	v := versionInfo{
		Version:  "(devel)",
		Go:       runtime.Version(),
		Platform: runtime.GOOS + "/" + runtime.GOARCH,
		GDAL:     gdal.Version(),
	}
	info, ok := debug.ReadBuildInfo()
	if !ok {
		return v
	}
	if info.Main.Version != "" {
		v.Version = info.Main.Version
	}
	for _, s := range info.Settings {
		switch s.Key {
		case "vcs.revision":
			v.Revision = s.Value
		case "vcs.time":
			v.Time = s.Value
		case "vcs.modified":
			v.Modified = s.Value == "true"
		}
	}
	return v
}
