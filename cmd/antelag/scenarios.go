package main

import (
	"fmt"
	"io"
	"strings"
	"text/tabwriter"

	"github.com/spf13/cobra"

	"antelag/scenarios"
)

func newScenarios() *cobra.Command {
	asJSON := false
	cmd := &cobra.Command{
		Use:               "scenarios [NAME]",
		Short:             "list the embedded scenarios, or print one to start from",
		Args:              cobra.MaximumNArgs(1),
		ValidArgsFunction: completeScenario,
		RunE: func(cmd *cobra.Command, args []string) error {
			if len(args) == 1 {
				return printScenario(cmd.OutOrStdout(), args[0], asJSON)
			}
			return listScenarios(cmd.OutOrStdout(), asJSON)
		},
	}
	cmd.Flags().BoolVar(&asJSON, "json", false, "print one JSON object instead of the text")
	return cmd
}

func printScenario(out io.Writer, name string, asJSON bool) error {
	text, err := scenarios.Text(name)
	if err != nil {
		return err
	}
	if asJSON {
		return writeJSON(out, map[string]string{"name": name, "text": string(text)})
	}
	_, err = out.Write(text)
	return err
}

func listScenarios(out io.Writer, asJSON bool) error {
	type item struct {
		Name  string `json:"name"`
		Title string `json:"title"`
	}
	var items []item
	for _, name := range scenarios.Names() {
		s, err := scenarios.Load(name)
		if err != nil {
			return err
		}
		items = append(items, item{name, s.Title})
	}
	if asJSON {
		return writeJSON(out, map[string]any{"scenarios": items})
	}
	t := tabwriter.NewWriter(out, 0, 0, 2, ' ', 0)
	for _, i := range items {
		fmt.Fprintf(t, "%s\t%s\n", i.Name, i.Title)
	}
	return t.Flush()
}

// completeScenario offers the embedded scenarios beside files.
func completeScenario(*cobra.Command, []string, string) ([]string, cobra.ShellCompDirective) {
	return scenarios.Names(), cobra.ShellCompDirectiveDefault
}

// oneScenario asks for exactly one SCENARIO.
func oneScenario(command string) cobra.PositionalArgs {
	return func(_ *cobra.Command, args []string) error {
		if len(args) != 1 {
			return fmt.Errorf("%s takes one SCENARIO: a file, or one of %s", command, strings.Join(scenarios.Names(), ", "))
		}
		return nil
	}
}
