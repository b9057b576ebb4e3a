package main

import (
	"fmt"

	"github.com/spf13/cobra"

	"antelag/rtloop/runlog"
	"antelag/scenarios/quantity"
)

// logFlags are the flags of every command that reads a log.
type logFlags struct {
	columns runlog.Map
	units   runlog.Units
	rate    string
	channel string
}

const aboutLogs = `LOG is a log that run wrote, or any table of numbers: separated by commas,
semicolons, tabs or blanks, with decimal points or commas, below any heading, gzip
too. Its columns are found by their headings (time, target, command, measured,
force, also with a channel in front like damper.force, and units like "force [kN]"),
or are said by --map and --units. Uneven time stamps are resampled, and whatever is
mended is said.`

func (f *logFlags) flags(cmd *cobra.Command) {
	s := cmd.Flags()
	s.Var(&f.columns, "map", "which column is what, `ROLE=COLUMN`, by heading or number: time=1,target=x_ref,measured=3,force=4")
	s.Var(&f.units, "units", "the `UNITS` of columns whose headings name none: mm,kN or target=in,force=kip")
	s.StringVar(&f.rate, "rate", "", "the `RATE` of rows without good time stamps, like \"1024 Hz\"")
	s.StringVar(&f.channel, "channel", "", "read the channel of this `NAME` alone")
}

// options reads the flags; every channel must have what is needed.
func (f *logFlags) options(need ...runlog.Role) (runlog.Options, error) {
	o := runlog.Options{Map: f.columns, Units: f.units, Channel: f.channel, Need: need}
	if f.rate == "" {
		return o, nil
	}
	var err error
	if o.Rate, err = quantity.ParseAs(f.rate, quantity.Frequency); err == nil && !(o.Rate > 0) {
		err = fmt.Errorf("%s must be above zero", f.rate)
	}
	if err != nil {
		return o, fmt.Errorf("--rate: %w", err)
	}
	return o, nil
}
