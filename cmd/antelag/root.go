package main

import (
	"errors"
	"fmt"
	"strconv"

	"github.com/spf13/cobra"
	"github.com/spf13/pflag"

	"antelag/scenarios"
	"antelag/scenarios/kind"
)

const about = `antelag tunes the delay compensation of a real-time hybrid test before a
specimen is put at risk: it runs the loop of numerical substructure, compensator,
servo-hydraulic actuator and specimen tick by tick, and says with numbers
whether the test would be accurate and stable.

Without a command it opens the dashboard on the embedded scenario "` + scenarios.Default + `"
where there is a terminal, and else, or with flags of run, runs it headless.

` + cautions

const cautions = `Caution: hydraulic actuators crush. This is a simulation; it is no interlock.
Keep the hardware limits, the emergency stop and the lab's procedure. Local codes
and the responsible licensed engineer decide.`

func newRoot() *cobra.Command {
	opts := &runOptions{}
	root := &cobra.Command{
		Use:           "antelag",
		Short:         "tune the delay compensation of a real-time hybrid test",
		Long:          about,
		Args:          noCommand,
		Version:       version(),
		SilenceErrors: true,
		SilenceUsage:  true,
		RunE: func(cmd *cobra.Command, _ []string) error {
			// Flags are those of run, and mean run.
			if onTerminal() && cmd.Flags().NFlag() == 0 {
				return bench(cmd, scenarios.Default, nil)
			}
			return opts.run(cmd, []string{scenarios.Default})
		},
	}
	opts.flags(root)
	root.SetFlagErrorFunc(flagError)
	root.SetVersionTemplate("antelag {{.Version}}\n")
	root.AddCommand(
		newBench(),
		newRun(),
		newReplay(),
		newIdentify(),
		newMargin(),
		newTempo(),
		newTune(),
		newSweep(),
		newGather(),
		newCheck(),
		newHandoff(),
		newReport(),
		newPace(),
		newScenarios(),
		newDescribe(),
		newVersion(),
	)
	root.InitDefaultHelpCmd()
	if help, _, err := root.Find([]string{"help"}); err == nil {
		help.Args = knownCommand
	}
	return root
}

// flagError says of a number that is none that it is none.
func flagError(_ *cobra.Command, err error) error {
	var number *strconv.NumError
	var flag *pflag.InvalidValueError
	if !errors.As(err, &number) || !errors.As(err, &flag) {
		return err
	}
	what := "a whole number"
	switch {
	case errors.Is(number, strconv.ErrRange):
		what = "smaller"
	case number.Func == "ParseFloat":
		what = "a number"
	case number.Func == "ParseUint":
		what = "a whole number from 0 on"
	}
	return fmt.Errorf("--%s %s: it must be %s", flag.GetFlag().Name, flag.GetValue(), what)
}

// knownCommand refuses to explain what is no command.
func knownCommand(cmd *cobra.Command, args []string) error {
	if found, _, err := cmd.Root().Find(args); err == nil && found != cmd.Root() {
		return nil
	}
	return noCommand(cmd.Root(), args)
}

// noArgument refuses arguments of a command that takes none.
func noArgument(cmd *cobra.Command, args []string) error {
	if len(args) > 0 {
		return fmt.Errorf("%s takes no argument; there is %q", cmd.Name(), args[0])
	}
	return nil
}

// noCommand refuses arguments of the bare command: what stands there is meant
// to be a command, or a scenario.
func noCommand(cmd *cobra.Command, args []string) error {
	if len(args) == 0 {
		return nil
	}
	var known []string
	for _, c := range cmd.Commands() {
		if c.IsAvailableCommand() {
			known = append(known, c.Name())
		}
	}
	return fmt.Errorf("%w; a scenario is run by antelag run SCENARIO", &kind.UnknownError{What: "command", Got: args[0], Known: known})
}
