package main

import (
	"github.com/spf13/cobra"

	"antelag/scenarios"
)

func newDescribe() *cobra.Command {
	return &cobra.Command{
		Use:   "describe [KIND]",
		Short: "the manual of kinds and settings",
		Args:  cobra.MaximumNArgs(1),
		ValidArgsFunction: func(*cobra.Command, []string, string) ([]string, cobra.ShellCompDirective) {
			var names []string
			for _, c := range scenarios.Chapters() {
				names = append(names, c.Title)
				for _, k := range c.Kinds {
					names = append(names, k.Name)
				}
			}
			return names, cobra.ShellCompDirectiveNoFileComp
		},
		RunE: func(cmd *cobra.Command, args []string) error {
			return scenarios.WriteManual(cmd.OutOrStdout(), append(args, "")[0])
		},
	}
}
