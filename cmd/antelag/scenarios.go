package main

import (
	"fmt"
	"text/tabwriter"

	"github.com/spf13/cobra"

	"antelag/scenarios"
)

func newScenarios() *cobra.Command {
	return &cobra.Command{
		Use:               "scenarios [NAME]",
		Short:             "list the embedded scenarios, or print one to start from",
		Args:              cobra.MaximumNArgs(1),
		ValidArgsFunction: completeScenario,
		RunE: func(cmd *cobra.Command, args []string) error {
			if len(args) == 1 {
				text, err := scenarios.Text(args[0])
				if err != nil {
					return err
				}
				_, err = cmd.OutOrStdout().Write(text)
				return err
			}
			t := tabwriter.NewWriter(cmd.OutOrStdout(), 0, 0, 2, ' ', 0)
			for _, name := range scenarios.Names() {
				s, err := scenarios.Load(name)
				if err != nil {
					return err
				}
				fmt.Fprintf(t, "%s\t%s\n", name, s.Title)
			}
			return t.Flush()
		},
	}
}

// completeScenario offers the embedded scenarios beside files.
func completeScenario(*cobra.Command, []string, string) ([]string, cobra.ShellCompDirective) {
	return scenarios.Names(), cobra.ShellCompDirectiveDefault
}
