package main

import (
	"github.com/spf13/cobra"

	"antelag/scenarios"
)

func newDescribe() *cobra.Command {
	asJSON := false
	cmd := &cobra.Command{
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
			name := append(args, "")[0]
			if !asJSON {
				return scenarios.WriteManual(cmd.OutOrStdout(), name)
			}
			entries, err := scenarios.Manual(name)
			if err != nil {
				return err
			}
			return writeJSON(cmd.OutOrStdout(), map[string]any{"kinds": entries})
		},
	}
	cmd.Flags().BoolVar(&asJSON, "json", false, "print one JSON object instead of the text")
	return cmd
}
