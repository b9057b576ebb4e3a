package main

import (
	"context"
	"errors"
	"fmt"
	"io"
	"os"
	"runtime"
	"time"

	"github.com/spf13/cobra"

	"antelag/scenarios"
	"antelag/scenarios/study"
)

// sweepOptions are the flags of sweep.
type sweepOptions struct {
	request  study.Request
	law      string
	sampling string
	csv      string
	png      string
	shard    string
	workers  int
	force    bool
	json     bool
}

func newSweep() *cobra.Command {
	o := &sweepOptions{}
	cmd := &cobra.Command{
		Use:   "sweep SCENARIO",
		Short: "run a scenario many times, on a grid of settings or over its [spread]",
		Long: `Run a scenario many times with some settings changed: on a grid (--over), over
draws from its [spread] (--draws), or both, which makes all draws at every point
of the grid. Exit code: 0 every run passes, 1 one does not, 2 bad input.

With --csv every run is a row, in order, SI; the file is the same for any number
of workers. The same command goes on with a file that was broken off. --shard i/n
does one part of n and writes FILE.i-of-n.csv; "antelag gather FILE.csv" puts all
parts together. --shard slurm takes i and n from a Slurm job array:

    sbatch --array=1-20 --wrap "antelag sweep mine.toml --draws 100000 \
        --csv mine.csv --shard slurm --workers 1; [ \$? -le 1 ]"

(exit 1 says that some runs fail, which is no failure of the task). A task that is
requeued goes on where it was.

` + cautions,
		Args:              oneScenario("sweep"),
		ValidArgsFunction: completeScenario,
		RunE:              o.run,
	}
	f := cmd.Flags()
	f.StringArrayVar(&o.request.Sets, "set", nil, setHelp)
	f.StringArrayVar(&o.request.Over, "over", nil, "go over a setting, `SETTING=a:b:n` or SETTING=a:b:n:log; several make a grid, the last goes fastest")
	f.Int64Var(&o.request.Draws, "draws", 0, "draw the settings of [spread] `N` times")
	f.StringVar(&o.law, "law", "", "the `LAW` of the draws: uniform, or normal with the ends at three standard deviations (default: uniform)")
	f.StringVar(&o.sampling, "sampling", "", "the `SAMPLING` of the draws: latin, a Latin hypercube, or independent (default: latin)")
	f.Int64Var(&o.request.Seed, "seed", 1, "seed `N` of the draws")
	f.StringVar(&o.request.Lane, "lane", scenarios.Configured, "judge the lane of this `NAME`")
	f.StringVar(&o.csv, "csv", "", "write every run to this CSV `FILE`, with its provenance beside it")
	f.StringVar(&o.png, "png", "", "draw the summary into this `FILE`, PNG or SVG by its ending")
	f.StringVar(&o.shard, "shard", "", "do one part of the runs, `i/n`, or slurm inside a job array")
	f.IntVar(&o.workers, "workers", 0, "make `N` runs at once (default: as many as there are cores)")
	f.BoolVar(&o.force, "force", false, "overwrite existing files, also those of another study")
	f.BoolVar(&o.json, "json", false, "print one JSON object instead of the table")
	return cmd
}

func (o *sweepOptions) run(cmd *cobra.Command, args []string) error {
	st, shard, err := o.prepare(args[0])
	if err != nil {
		return err
	}
	sum := study.NewSummary(st)
	first, last := shard.Part(st.Runs())
	var table *study.Table
	if o.csv != "" {
		if table, err = study.OpenTable(o.csv, st, shard, version(), o.force, sum.Add); err != nil {
			return fileError("--csv", err)
		}
		first, last = table.Left()
	}
	there, began := sum.Runs, time.Now()
	err = o.runs(cmd.Context(), st, first, last, table, sum)
	sum.Compute = study.Compute{Wall: time.Since(began).Seconds(), Runs: sum.Runs - there, Workers: o.workers}
	if e := o.print(cmd.OutOrStdout(), sum); e != nil {
		return &failure{e}
	}
	if e := o.draw(sum); err == nil {
		err = e
	}
	switch {
	case err != nil && !errors.Is(err, context.Canceled):
		return &failure{err}
	case err != nil || !sum.Pass():
		return errVerdict
	}
	return nil
}

// prepare reads everything that can be wrong before anything is written.
func (o *sweepOptions) prepare(name string) (*study.Study, study.Shard, error) {
	shard, err := study.ParseShard(o.shard, os.LookupEnv)
	if err != nil {
		return nil, shard, err
	}
	if !shard.Whole() && o.csv == "" {
		return nil, shard, errors.New("--shard writes a part of a table; say which with --csv")
	}
	table := o.csv
	if table != "" {
		table = shard.Path(table)
	}
	if err := refuse([]output{{flag: "--csv", path: table, goesOn: true}, {flag: "--png", path: o.png, picture: true}},
		o.force, theScenario, name); err != nil {
		return nil, shard, err
	}
	if err := checkWorkers(o.workers); err != nil {
		return nil, shard, err
	}
	if o.workers == 0 {
		o.workers = runtime.GOMAXPROCS(0)
	}
	if o.request.Law, err = study.ParseLaw(o.law); err != nil {
		return nil, shard, err
	}
	if o.request.Sampling, err = study.ParseSampling(o.sampling); err != nil {
		return nil, shard, err
	}
	run := runOptions{sets: o.request.Sets}
	tests, err := run.load([]string{name})
	if err != nil {
		return nil, shard, err
	}
	if err := tests[0].CheckLane(o.request.Lane); err != nil {
		return nil, shard, fmt.Errorf("--lane: %w", err)
	}
	st, err := study.New(tests[0], o.request)
	if err != nil {
		return nil, shard, err
	}
	_, err = tests[0].Build()
	return st, shard, err
}

// runs makes the runs and hands each to the table and the summary.
func (o *sweepOptions) runs(ctx context.Context, st *study.Study, first, last int64, table *study.Table, sum *study.Summary) error {
	bar := newProgress(st.Scenario.Name)
	defer bar.clear()
	defer context.AfterFunc(ctx, bar.clear)()
	err := st.Run(ctx, first, last, study.Options{Workers: o.workers, Progress: bar.report}, func(rows []study.Row) error {
		if table != nil {
			if err := table.Append(rows); err != nil {
				return err
			}
		}
		for _, r := range rows {
			sum.Add(r)
		}
		return nil
	})
	if table != nil {
		if e := table.Close(); err == nil {
			err = e
		}
	}
	return err
}

func (o *sweepOptions) print(out io.Writer, sum *study.Summary) error {
	if o.json {
		return writeJSON(out, sum)
	}
	return sum.WriteText(out, inColour())
}

// draw draws the picture, if there is to be one.
func (o *sweepOptions) draw(sum *study.Summary) error {
	if sum.Runs == 0 {
		return nil
	}
	return savePicture("--png", o.png, o.force, sum.Picture)
}

// fileError sorts errors about output files: what stands in the way is for the
// user to put right; what cannot be written is a failure.
func fileError(flag string, err error) error {
	err = fmt.Errorf("%s: %w", flag, err)
	if errors.Is(err, study.ErrMismatch) {
		return err
	}
	return &failure{err}
}
