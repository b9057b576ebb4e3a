package main

import (
	"bytes"
	"context"
	"errors"
	"fmt"
	"io"
	"io/fs"
	"path/filepath"
	"strings"
	"text/tabwriter"

	"github.com/spf13/cobra"

	"antelag/compensator/handoff"
	"antelag/scenarios"
	"antelag/scenarios/kind"
)

// handoffOptions are the flags of handoff.
type handoffOptions struct {
	sets     []string
	dir      string
	lane     string
	channels []string
	seed     uint64
	force    bool
	json     bool
}

func newHandoff() *cobra.Command {
	o := &handoffOptions{}
	cmd := &cobra.Command{
		Use:   "handoff SCENARIO -o DIR",
		Short: "write the tuned compensators as C for the lab's controller",
		Long: `Write the compensator of every channel as C99: a header and a source that allocate
nothing and hold all their state in one struct, with a guard that holds the last
good command when an input is none that the channel's limits allow. Beside them
stand test vectors computed by this program, a self-test that runs them, and a
Makefile: make -C DIR test.

Exit code: 0 good, 1 it could not write or was interrupted, 2 bad input.

` + cautions,
		Args:              oneScenario("handoff"),
		ValidArgsFunction: completeScenario,
		RunE:              o.run,
	}
	f := cmd.Flags()
	f.StringVarP(&o.dir, "output", "o", "", "write into this `DIR`")
	f.StringVar(&o.lane, "lane", scenarios.Configured, "write the compensators of the lane of this `NAME`")
	f.StringArrayVar(&o.channels, "channel", nil, "only the channel of this `NAME`; may be repeated")
	f.StringArrayVar(&o.sets, "set", nil, setHelp)
	f.Uint64Var(&o.seed, "seed", 1, "seed `N` that the input of the test vectors is drawn with")
	f.BoolVar(&o.force, "force", false, "overwrite existing files")
	f.BoolVar(&o.json, "json", false, "print one JSON object instead of the table")
	return cmd
}

func (o *handoffOptions) run(cmd *cobra.Command, args []string) error {
	if o.dir == "" {
		return errors.New("handoff needs -o DIR, the directory to write into")
	}
	test, err := o.load(args[0])
	if err != nil {
		return err
	}
	files, report, err := handoff.Make(test)
	if err != nil {
		return err
	}
	for _, f := range files {
		if path := filepath.Join(o.dir, f.Name); sameFile(path, args[0]) {
			return fmt.Errorf("-o: %s is the scenario itself; choose another directory", path)
		}
	}
	if err := o.write(cmd.Context(), files); err != nil {
		return err
	}
	if o.json {
		err = writeJSON(cmd.OutOrStdout(), report)
	} else {
		err = o.print(cmd.OutOrStdout(), report)
	}
	if err != nil {
		return &failure{err}
	}
	return nil
}

// load reads the scenario and picks what is handed over.
func (o *handoffOptions) load(name string) (*handoff.Test, error) {
	changes, err := parseChanges(o.sets)
	if err != nil {
		return nil, err
	}
	s, err := scenarios.Load(name, changes...)
	if err != nil {
		return nil, err
	}
	if _, err := s.Build(); err != nil { // its errors know the line
		return nil, err
	}
	return o.test(s)
}

func (o *handoffOptions) test(s *scenarios.Scenario) (*handoff.Test, error) {
	parts, err := s.Compensators(o.lane)
	if err != nil {
		return nil, fmt.Errorf("--lane: %w", err)
	}
	chosen := map[string]bool{}
	for _, name := range o.channels {
		chosen[name] = true
	}
	var text bytes.Buffer
	s.WriteTo(&text) //nolint:errcheck // a Buffer does not fail
	test := &handoff.Test{
		Title: s.Title, Scenario: s.Name, Text: text.Bytes(), Lane: o.lane, Version: version(), Seed: o.seed,
		Rate: s.Loop.Num("rate"), Slowdown: s.Loop.Num("slowdown"), Hold: s.Loop.Text("hold"),
	}
	for j := range s.Channels {
		c := &s.Channels[j]
		if len(chosen) > 0 && !chosen[c.Name] {
			continue
		}
		delete(chosen, c.Name)
		test.Channels = append(test.Channels, handoff.Channel{
			Name: c.Name, Kind: parts[j].Kind.Name, Values: parts[j].Values, Limits: handoff.LimitsOf(c.Limits),
		})
	}
	for _, name := range o.channels {
		if chosen[name] {
			return nil, fmt.Errorf("--channel: %w", &kind.UnknownError{What: "channel", Got: name, Known: s.ChannelNames()})
		}
	}
	return test, nil
}

// write writes the files. That they exist is for the user to put right; that they
// cannot be written is a failure.
func (o *handoffOptions) write(ctx context.Context, files []handoff.File) error {
	err := handoff.Write(ctx, o.dir, files, o.force)
	switch {
	case err == nil:
		return nil
	case errors.Is(err, fs.ErrExist):
		return fmt.Errorf("-o: %w", err)
	case errors.Is(err, context.Canceled):
		return &failure{errors.New("interrupted; nothing was written")}
	}
	return &failure{fmt.Errorf("-o: %w", err)}
}

func (o *handoffOptions) print(out io.Writer, r *handoff.Report) error {
	fmt.Fprintf(out, "%s, %s lane, %g ticks a second, in %s\n\n", r.Scenario, r.Lane, r.Rate, o.dir)
	t := tabwriter.NewWriter(out, 0, 0, 2, ' ', 0)
	fmt.Fprintf(t, "channel\tcompensator\tC\tstate\tdouble within\tfloat within\n")
	for _, c := range r.Channels {
		fmt.Fprintf(t, "%s\t%s\t%s.h, .c\t%d bytes\t%.2g m\t%.2g m\n", c.Name, c.Compensator, c.Identifier, c.StateBytes,
			c.DoubleBound, c.FloatBound)
	}
	t.Flush() //nolint:errcheck // the last line tells
	for _, c := range r.Channels {
		if len(c.Unguarded) > 0 {
			fmt.Fprintf(out, "\n%s has no limit of %s: the guard cannot hold what has none", c.Name, strings.Join(c.Unguarded, ", "))
		}
	}
	_, err := fmt.Fprintf(out, "\nProve it with the compiler of the controller: make -C %s test\n\n%s\n", shellWord(o.dir), cautions)
	return err
}

// shellWord writes a path as a shell takes it.
func shellWord(path string) string {
	if strings.Trim(path, "abcdefghijklmnopqrstuvwxyzABCDEFGHIJKLMNOPQRSTUVWXYZ0123456789_-./") == "" {
		return path
	}
	return "'" + strings.ReplaceAll(path, "'", `'\''`) + "'"
}
