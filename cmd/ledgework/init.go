package main

import (
	"context"
	"errors"
	"fmt"
	"io/fs"
	"os"
	"path/filepath"

	"github.com/spf13/cobra"
	"github.com/spf13/pflag"

	"ledgework/cmd/internal/worksite"
)

// InitOptions are the flags of init.
type InitOptions struct {
	Out       string
	Overwrite bool
	Source    SourceOptions
}

// AddFlags declares the flags.
func (o *InitOptions) AddFlags(f *pflag.FlagSet) {
	f.StringVarP(&o.Out, "output", "o", "worksite.yaml", "worksite file to write")
	f.BoolVar(&o.Overwrite, "overwrite", false, "replace the file if it exists")
	o.Source.AddFlags(f)
	f.BoolVar(&o.Source.Tolerant, "tolerate-defects", false, "pass over damaged points and a cut-off end, and count them")
}

// SourceOptions say how survey files are read where no worksite does.
type SourceOptions struct {
	CRS      string
	Band     int
	Tolerant bool
}

// AddFlags declares the flags that every command on survey files has.
func (o *SourceOptions) AddFlags(f *pflag.FlagSet) {
	f.StringVar(&o.CRS, "crs", "", "CRS of the files' coordinates, if they carry none: EPSG:n, WKT or PROJJSON")
	f.IntVar(&o.Band, "band", 0, "elevation band of a grid, from 1 (default: found by itself)")
}

func newInitCommand(g *globals, term *terminal) *cobra.Command {
	var opts InitOptions
	cmd := &cobra.Command{
		Use:   "init FILE…",
		Short: "Write a commented worksite file for surveys",
		Long: `Init looks at survey files, folders or globs and writes a worksite file for them,
with the CRS, spacing and extent it found, and every key and default explained.`,
		Example: `  ledgework init scan/*.las
  ledgework init --crs EPSG:32633 -o cliff.yaml cloud.xyz`,
		Args: someArguments("FILE"),
		RunE: func(cmd *cobra.Command, args []string) error {
			return runInit(cmd.Context(), g, opts, args, term)
		},
	}
	opts.AddFlags(cmd.Flags())
	return cmd
}

func runInit(ctx context.Context, g *globals, opts InitOptions, args []string, term *terminal) error {
	if _, err := os.Lstat(opts.Out); err == nil && !opts.Overwrite {
		return usageError{fmt.Errorf("%s already exists; choose another with -o, or pass --overwrite", opts.Out)}
	}
	progress, closeProgress := newProgress(g, term)
	w, notes, err := worksite.Start(ctx, filepath.Dir(opts.Out), args, worksite.StartOptions{
		CRS: opts.Source.CRS, Tolerant: opts.Source.Tolerant, Band: opts.Source.Band,
		Threads: g.Threads, Progress: progress,
	})
	closeProgress()
	if err != nil {
		return err
	}
	text, err := w.Text()
	if err != nil {
		return err
	}
	if err := writeFile(opts.Out, text); err != nil {
		return err
	}
	if g.JSON {
		return writeJSON(term.out, map[string]any{"file": opts.Out, "worksite": w, "notes": notes})
	}
	if g.Quiet {
		return nil
	}
	for _, n := range notes {
		fmt.Fprintln(term.err, "note: "+n)
	}
	_, err = fmt.Fprintf(term.out, "%s: CRS %s, spacing %s m; read it through, then: ledgework build %s\n", opts.Out, w.CRS, w.SpacingM, opts.Out)
	return err
}

// writeFile writes a file at once or not at all.
func writeFile(path string, text []byte) error {
	temp, err := os.CreateTemp(filepath.Dir(path), "."+filepath.Base(path)+".partial-")
	if err != nil {
		return usageError{fmt.Errorf("cannot write %s: %w", path, cause(err))}
	}
	defer func() { _ = os.Remove(temp.Name()) }() // it is gone once it was renamed
	_, err = temp.Write(text)
	err = errors.Join(err, temp.Chmod(0o644), temp.Close())
	if err == nil {
		err = os.Rename(temp.Name(), path)
	}
	if err != nil {
		return fmt.Errorf("cannot write %s: %w", path, cause(err))
	}
	return nil
}

// cause is an error of the operating system without the temporary path.
func cause(err error) error {
	var p *fs.PathError
	if errors.As(err, &p) {
		return p.Err
	}
	return err
}
