package main

import (
	"errors"

	"github.com/spf13/cobra"

	"antelag/scenarios/study"
)

func newGather() *cobra.Command {
	var o sweepOptions
	cmd := &cobra.Command{
		Use:   "gather FILE.csv",
		Short: "put the parts of a sweep that was shared out together",
		Long: `Put the parts that "antelag sweep --csv FILE.csv --shard i/n" wrote,
FILE.1-of-n.csv and so on, together as FILE.csv, byte for byte what one sweep would
have written, and sum them up. All parts must be there, whole and of one study.

Exit code: 0 every run passes, 1 one does not, 2 bad input.

` + cautions,
		Args: func(_ *cobra.Command, args []string) error {
			if len(args) != 1 {
				return errors.New("gather takes one FILE.csv: the --csv of the sweep whose parts it puts together")
			}
			return nil
		},
		RunE: func(cmd *cobra.Command, args []string) error {
			if err := refuse([]output{{flag: "--png", path: o.png, picture: true}}, o.force, "is the table itself", args[0]); err != nil {
				return err
			}
			var sum *study.Summary
			_, _, err := study.Gather(args[0], o.force, func(st *study.Study) { sum = study.NewSummary(st) }, func(r study.Row) { sum.Add(r) })
			if err != nil {
				return err
			}
			if err := o.print(cmd.OutOrStdout(), sum); err != nil {
				return &failure{err}
			}
			if err := o.draw(sum); err != nil {
				return &failure{err}
			}
			if !sum.Pass() {
				return errVerdict
			}
			return nil
		},
	}
	cmd.Flags().BoolVar(&o.force, "force", false, "overwrite existing files")
	cmd.Flags().StringVar(&o.png, "png", "", "draw the summary into this `FILE`, PNG or SVG by its ending")
	cmd.Flags().BoolVar(&o.json, "json", false, "print one JSON object instead of the table")
	return cmd
}
