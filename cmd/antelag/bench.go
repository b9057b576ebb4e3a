package main

import (
	"errors"
	"fmt"
	"os"

	"github.com/spf13/cobra"
	"golang.org/x/term"

	"antelag/tui"
)

func newBench() *cobra.Command {
	var sets []string
	cmd := &cobra.Command{
		Use:   "bench SCENARIO",
		Short: "tune compensators on a loop that runs live, on a dashboard",
		Long: `Run a scenario live, at its real rate, on a dashboard: the settings of every
compensator can be changed while it runs, and each change is judged over the
whole scenario at once. SCENARIO is a file or the name of an embedded one.

Keys: arrows choose and change settings, enter edits, space pauses, ? shows all
keys, q quits. It needs a terminal of at least 80 columns and 24 rows.

` + cautions,
		Args:              oneScenario("bench"),
		ValidArgsFunction: completeScenario,
		RunE: func(cmd *cobra.Command, args []string) error {
			return bench(cmd, args[0], sets)
		},
	}
	cmd.Flags().StringArrayVar(&sets, "set", nil, setHelp)
	return cmd
}

// bench runs the dashboard. Bad input comes before the want of a terminal, and
// both before anything is drawn.
func bench(cmd *cobra.Command, name string, sets []string) error {
	o := runOptions{sets: sets}
	tests, err := o.load([]string{name})
	if err != nil {
		return err
	}
	if !onTerminal() {
		return errors.New("bench needs a terminal on stdin and stdout; antelag run " + name + " runs the scenario without one")
	}
	return onDashboard(tui.Run(cmd.Context(), tests[0]))
}

// onDashboard says what ended a dashboard; a panic with where it was.
func onDashboard(err error) error {
	var broken *tui.Panic
	if errors.As(err, &broken) {
		fmt.Fprintf(os.Stderr, "%s\n", broken.Stack)
		return &failure{err}
	}
	return err
}

// onTerminal reports whether a person sits at stdin and stdout, with a terminal
// that can be drawn on.
func onTerminal() bool {
	if t := os.Getenv("TERM"); t == "" || t == "dumb" {
		return false
	}
	return term.IsTerminal(int(os.Stdin.Fd())) && term.IsTerminal(int(os.Stdout.Fd()))
}
