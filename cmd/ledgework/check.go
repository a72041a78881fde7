package main

import (
	"context"
	"fmt"
	"text/tabwriter"

	"github.com/spf13/cobra"

	"ledgework/cmd/internal/worksite"
)

func newCheckCommand(g *globals, term *terminal) *cobra.Command {
	return &cobra.Command{
		Use:   "check WORKSITE",
		Short: "Validate a worksite file and its inputs without processing them",
		Long: `Check reads a worksite file, opens every survey file it names, chooses the working
CRS and says what it would do. Points are not processed.`,
		Example: `  ledgework check worksite.yaml`,
		Args:    oneArgument("WORKSITE"),
		RunE: func(cmd *cobra.Command, args []string) error {
			return runCheck(cmd.Context(), g, args, term)
		},
	}
}

func runCheck(ctx context.Context, g *globals, args []string, term *terminal) error {
	w, err := worksite.Load(args[0])
	if err != nil {
		return err
	}
	c, err := w.Check(ctx)
	if err != nil {
		return err
	}
	if g.JSON {
		return writeJSON(term.out, c)
	}
	if g.Quiet {
		return nil
	}
	t := tabwriter.NewWriter(term.out, 0, 0, 2, ' ', 0)
	for _, f := range c.Files {
		fmt.Fprintf(t, "%s\t%s\t%s\n", f.Path, f.Format, points(f.Points))
	}
	if err := t.Flush(); err != nil {
		return err
	}
	if c.CRS != "" {
		fmt.Fprintf(term.out, "working CRS: %s\n", c.CRS)
	}
	for _, n := range c.Notes {
		fmt.Fprintf(term.out, "note: %s\n", n)
	}
	_, err = fmt.Fprintf(term.out, "%s: ready to build\n", args[0])
	return err
}

// points is a number of points for people.
func points(n int64) string {
	switch {
	case n < 0:
		return "points not counted"
	case n == 1:
		return "1 point"
	}
	return fmt.Sprintf("%d points", n)
}
