package main

import (
	"context"
	"errors"
	"fmt"
	"io"
	"strings"
	"text/tabwriter"

	"github.com/spf13/cobra"
	"github.com/spf13/pflag"

	"ledgework/cmd/internal/worksite"
	"ledgework/terrain/grid"
	"ledgework/terrain/survey"
)

// InspectOptions are the flags of inspect.
type InspectOptions struct {
	Source SourceOptions
}

// AddFlags declares the flags.
func (o *InspectOptions) AddFlags(f *pflag.FlagSet) {
	o.Source.AddFlags(f)
}

func newInspectCommand(g *globals, term *terminal) *cobra.Command {
	var opts InspectOptions
	cmd := &cobra.Command{
		Use:   "inspect FILE…",
		Short: "Say what is in survey files",
		Long: `Inspect reads survey files from end to end and says what is in them: points, extent,
CRS, density, classes, returns, of an elevation grid how steep it is, and what was wrong.
Damage is passed over and counted.`,
		Example: `  ledgework inspect scan/*.las
  ledgework inspect --json dem.tif`,
		Args: someArguments("FILE"),
		RunE: func(cmd *cobra.Command, args []string) error {
			return runInspect(cmd.Context(), g, opts, args, term)
		},
	}
	opts.AddFlags(cmd.Flags())
	return cmd
}

func runInspect(ctx context.Context, g *globals, opts InspectOptions, args []string, term *terminal) error {
	paths, err := survey.Expand("", args)
	if err != nil {
		return usageError{errors.New(strings.TrimPrefix(err.Error(), "survey: "))}
	}
	summaries := []*summary{}
	for _, p := range paths {
		s, err := survey.Inspect(ctx, p, survey.Options{CRS: opts.Source.CRS, Band: opts.Source.Band, Tolerant: true})
		if ctx.Err() != nil {
			return ctx.Err()
		}
		if err != nil {
			return &worksite.SurveyError{Err: err}
		}
		both := &summary{Summary: s}
		if s.Cell > 0 && s.Unusable == "" {
			both.Slopes, err = slopesOf(ctx, p, grid.Options{Band: opts.Source.Band, CRS: opts.Source.CRS}, s.CRS.WKT)
			if ctx.Err() != nil {
				return ctx.Err()
			}
			if err != nil {
				return &worksite.SurveyError{Err: err}
			}
		}
		summaries = append(summaries, both)
	}
	switch {
	case g.JSON:
		err = writeJSON(term.out, summaries)
	case !g.Quiet:
		err = printSummaries(term.out, summaries)
	}
	if err != nil {
		return err
	}
	for _, s := range summaries {
		if s.Unusable != "" {
			return &worksite.SurveyError{Err: errors.New(s.Unusable)}
		}
	}
	return nil
}

// A summary is what inspect says of one file.
type summary struct {
	*survey.Summary
	Slopes *Slopes `json:"slopes,omitempty"` // of an elevation grid
}

// printSummaries writes one block for each file.
func printSummaries(w io.Writer, summaries []*summary) error {
	t := tabwriter.NewWriter(w, 0, 0, 2, ' ', 0)
	for i, s := range summaries {
		if i > 0 {
			fmt.Fprintln(t)
		}
		printSummary(t, s)
	}
	return t.Flush()
}

func printSummary(w io.Writer, s *summary) {
	row := func(name, format string, args ...any) {
		fmt.Fprintf(w, "%s\t%s\n", name, fmt.Sprintf(format, args...))
	}
	fmt.Fprintln(w, s.Path)
	row("  format", "%s", s.Format)
	if s.Date != "" || s.Producer != "" {
		row("  made", "%s", strings.TrimSpace(s.Date+" "+s.Producer))
	}
	if s.Promised >= 0 && s.Promised != s.Points {
		row("  points", "%d, the header promises %d", s.Points, s.Promised)
	} else {
		row("  points", "%d", s.Points)
	}
	if s.NotFinite > 0 {
		row("  not finite", "%d points", s.NotFinite)
	}
	if s.Points > s.NotFinite {
		for i, axis := range [3]string{"x", "y", "z"} {
			row("  "+axis, "%.9g to %.9g", s.Min[i], s.Max[i])
		}
	}
	printPlace(row, s.Summary)
	if s.Cell > 0 {
		row("  grid", "cells of %g (%.4g m), %.1f %% without data", s.Cell, s.CellM, 100*s.NodataShare)
	} else if s.Density > 0 {
		row("  density", "%.3g points/m² where there are any, typically %.3g m apart", s.Density, s.Spacing)
	}
	if l := s.Slopes; l != nil {
		row("  slope", "%.1f° in the median, 10 %% below %.1f°, 10 %% above %.1f°, at most %.1f° (%s)", l.MedianDeg, l.P10Deg, l.P90Deg, l.MaxDeg, l.Method)
		row("  steep", "%.1f %% above 45°, %.1f %% above 60°, of the %d cells with all eight neighbours", 100*l.Above45, 100*l.Above60, l.Cells)
		row("  ruggedness", "%.3g m in the median (%s)", l.RuggednessM, l.RuggednessBy)
	}
	for _, c := range s.Classes {
		row("  class", "%d %s: %d", c.Class, c.Name, c.Count)
	}
	for _, r := range s.Returns {
		row("  return", "%d of %d: %d", r.Return, r.Of, r.Count)
	}
	if f := s.Flags; f != (survey.FlagCounts{}) {
		row("  flags", "%d synthetic, %d key, %d withheld, %d overlap", f.Synthetic, f.KeyPoint, f.Withheld, f.Overlap)
	}
	if s.Intensity != nil {
		row("  intensity", "%d to %d", s.Intensity[0], s.Intensity[1])
	}
	if s.Color {
		row("  colour", "yes")
	}
	for _, d := range s.Defects {
		row("  damage", "%s: %d times, first at %s", d.Reason, d.Count, d.First)
	}
	for _, n := range s.Notes {
		row("  note", "%s", n)
	}
	if s.Unusable != "" {
		row("  unusable", "%s", s.Unusable)
	}
}

// printPlace writes what the coordinates are and become.
func printPlace(row func(name, format string, args ...any), s *survey.Summary) {
	if s.CRS.Name == "" {
		row("  CRS", "none")
	} else {
		row("  CRS", "%s, %s", strings.TrimSpace(s.CRS.Name+" "+s.CRS.Code), s.CRS.Unit)
	}
	if s.CRS.VerticalName != "" {
		row("  heights", "%s", s.CRS.VerticalName)
	}
	if w := s.Working; w.Name != "" {
		row("  worked in", "%s", strings.TrimSpace(w.Name+" "+w.Code))
		for i, axis := range [3]string{"E", "N", "H"} {
			row("  "+axis, "%.3f to %.3f m", w.Min[i], w.Max[i])
		}
	}
}
