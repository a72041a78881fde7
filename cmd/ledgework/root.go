package main

import (
	"encoding/json"
	"fmt"
	"io"
	"runtime"

	"github.com/spf13/cobra"
	"github.com/spf13/pflag"
)

// globals are the flags that every command knows.
type globals struct {
	JSON    bool
	Quiet   bool
	Threads int

	started bool // a command has begun, so an error is not one of usage
}

// AddFlags declares the flags.
func (g *globals) AddFlags(f *pflag.FlagSet) {
	f.BoolVar(&g.JSON, "json", false, "write results and errors as JSON")
	f.BoolVarP(&g.Quiet, "quiet", "q", false, "say nothing but errors")
	f.IntVar(&g.Threads, "threads", 0, "processors to use (default: all)")
}

func newRootCommand(g *globals, term *terminal) *cobra.Command {
	cmd := &cobra.Command{
		Use:   "ledgework",
		Short: "From slope surveys to layers of obstacles and landing patches",
		Long: `Ledgework reads surveys of steep ground, finds bulges, overhangs and recesses,
scores the places where a platform can be set down, and writes both as GIS layers.

It shows geometry on the day of the survey, as far as the sensors saw it. It is a
screening aid: a competent person on site, local codes and licensed practice decide.`,
		SuggestionsMinimumDistance: 2,

		SilenceErrors: true,
		SilenceUsage:  true,
		Args:          knownCommand,
		RunE: func(cmd *cobra.Command, _ []string) error {
			return cmd.Help()
		},
		PersistentPreRunE: func(cmd *cobra.Command, _ []string) error {
			switch {
			case g.Threads < 0:
				return fmt.Errorf("--threads %d: at least one processor is needed", g.Threads)
			case g.Threads == 0:
				g.Threads = runtime.GOMAXPROCS(0)
			}
			g.started = true
			return nil
		},
	}
	g.AddFlags(cmd.PersistentFlags())
	cmd.SetOut(term.out)
	cmd.SetErr(term.err)
	cmd.SetUsageTemplate(cmd.UsageTemplate() + "\n" + exitTable())
	cmd.AddCommand(
		newInitCommand(g, term),
		newInspectCommand(g, term),
		newCheckCommand(g, term),
		newBuildCommand(g, term),
		newDemoCommand(g, term),
		newVersionCommand(g, term),
	)
	return cmd
}

// writeJSON writes v indented.
func writeJSON(w io.Writer, v any) error {
	enc := json.NewEncoder(w)
	enc.SetIndent("", "  ")
	enc.SetEscapeHTML(false)
	return enc.Encode(v)
}

// knownCommand refuses what is no command, and says which was meant.
func knownCommand(cmd *cobra.Command, args []string) error {
	if len(args) == 0 {
		return nil
	}
	hint := "'ledgework --help' lists them"
	if s := cmd.SuggestionsFor(args[0]); len(s) > 0 {
		hint = fmt.Sprintf("did you mean %q?", s[0])
	}
	return fmt.Errorf("there is no command %q; %s", args[0], hint)
}

// oneArgument wants exactly one argument, which is a what.
func oneArgument(what string) cobra.PositionalArgs {
	return func(cmd *cobra.Command, args []string) error {
		if len(args) != 1 {
			return fmt.Errorf("%d arguments where one %s is wanted; see '%s --help'", len(args), what, cmd.CommandPath())
		}
		return nil
	}
}

// someArguments wants at least one argument, each a what.
func someArguments(what string) cobra.PositionalArgs {
	return func(cmd *cobra.Command, args []string) error {
		if len(args) == 0 {
			return fmt.Errorf("no %s is given; see '%s --help'", what, cmd.CommandPath())
		}
		return nil
	}
}
