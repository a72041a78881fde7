package main

import (
	"context"
	"fmt"
	"path/filepath"

	"github.com/spf13/cobra"
	"github.com/spf13/pflag"

	"ledgework/cmd/internal/worksite"
)

// BuildOptions are the flags of build.
type BuildOptions struct {
	Out       string
	From      string
	Overwrite bool
}

// AddFlags declares the flags.
func (o *BuildOptions) AddFlags(f *pflag.FlagSet) {
	f.StringVarP(&o.Out, "output", "o", "", "folder to write (default: run, beside the worksite)")
	f.StringVar(&o.From, "from", "", "start from the voxels of an earlier run: its folder or voxels.parquet")
	f.BoolVar(&o.Overwrite, "overwrite", false, "replace the folder if it is an earlier run")
}

func newBuildCommand(g *globals, term *terminal) *cobra.Command {
	var opts BuildOptions
	cmd := &cobra.Command{
		Use:   "build WORKSITE",
		Short: "Process a worksite into layers of obstacles, patches and zones",
		Long: `Build reads the surveys of a worksite, finds obstacles, scores landing patches and
writes one folder: layers/*.geojson, run.json and voxels.parquet. The folder is
complete or not there at all.

With --from, the voxels of an earlier run stand in for the surveys, so that another
platform or other thresholds need not read them again.`,
		Example: `  ledgework build worksite.yaml
  ledgework build ledge.yaml --from run -o run-ledge`,
		Args: oneArgument("WORKSITE"),
		RunE: func(cmd *cobra.Command, args []string) error {
			return runBuild(cmd.Context(), g, opts, args, term)
		},
	}
	opts.AddFlags(cmd.Flags())
	return cmd
}

func runBuild(ctx context.Context, g *globals, opts BuildOptions, args []string, term *terminal) error {
	w, err := worksite.Load(args[0])
	if err != nil {
		return err
	}
	return build(ctx, g, opts, w, term)
}

// build runs the pipeline and tells the user what came of it.
func build(ctx context.Context, g *globals, opts BuildOptions, w *worksite.Worksite, term *terminal) error {
	out := opts.Out
	if out == "" {
		out = filepath.Join(filepath.Dir(w.Path()), "run")
	}
	progress, closeProgress := newProgress(g, term)
	result, err := w.Run(ctx, worksite.RunOptions{
		Out:       out,
		Overwrite: opts.Overwrite,
		From:      opts.From,
		Threads:   g.Threads,
		Version:   buildVersion().String(),
		Progress:  progress,
		OnFolder:  term.onAbandon,
	})
	closeProgress()
	if err != nil {
		return err
	}
	if err := printResult(g, term, result); err != nil {
		return err
	}
	return nothing(result)
}

// printResult writes what a run came to.
func printResult(g *globals, term *terminal, r *worksite.Result) error {
	if g.JSON {
		r.Exit = exitCode(nothing(r))
		return writeJSON(term.out, r)
	}
	if g.Quiet {
		return nil
	}
	for _, w := range r.Warnings {
		fmt.Fprintln(term.err, "warning: "+w)
	}
	printStages(term, r.Stages)
	_, err := fmt.Fprintf(term.out, "%s: %s, %s, %s\n", r.Run, count(r.Obstacles, "obstacle"), count(r.Patches, "patch"), count(r.Zones, "zone"))
	return err
}

// nothing is an error that says why when no ground qualifies.
func nothing(r *worksite.Result) error {
	if r.Reason == "" {
		return nil
	}
	return fmt.Errorf("%w: %s", worksite.ErrNothingQualifies, r.Reason)
}

// count is a number with its noun.
func count(n int, noun string) string {
	switch {
	case n == 1:
		return "1 " + noun
	case noun == "patch":
		noun = "patche"
	}
	return fmt.Sprintf("%d %ss", n, noun)
}
