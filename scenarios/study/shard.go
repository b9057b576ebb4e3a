package study

import (
	"errors"
	"fmt"
	"path/filepath"
	"strconv"
	"strings"
)

// Shard is one of N parts of a study, I from 1 on. The zero value is the whole.
type Shard struct{ I, N int }

// maxShards bounds the parts of a study.
const maxShards = 1e6

// Slurm is the text that stands for the shard of this task of a Slurm job array.
const Slurm = "slurm"

// ParseShard reads "3/7", or takes the shard from the variables that Slurm gives
// to each task of a job array (Slurm documentation, sbatch: SLURM_ARRAY_TASK_ID,
// _COUNT, _MIN, _MAX, _STEP). lookup is like os.LookupEnv.
func ParseShard(text string, lookup func(string) (string, bool)) (Shard, error) {
	switch text {
	case "":
		return Shard{}, nil
	case Slurm:
		return slurmShard(lookup)
	}
	left, right, ok := strings.Cut(text, "/")
	i, err1 := strconv.Atoi(left)
	n, err2 := strconv.Atoi(right)
	if !ok || err1 != nil || err2 != nil || n < 1 || n > maxShards || i < 1 || i > n {
		return Shard{}, fmt.Errorf("--shard %s: a shard is given as i/n, from 1/n to n/n, or as %s inside a job array", text, Slurm)
	}
	return Shard{i, n}, nil
}

func slurmShard(lookup func(string) (string, bool)) (Shard, error) {
	number := func(name, fallback string) (int, error) {
		text, ok := lookup(name)
		if !ok {
			text = fallback
		}
		if text == "" {
			return 0, fmt.Errorf("--shard %s: %s is not set; this is no task of a job array (sbatch --array=1-7)", Slurm, name)
		}
		v, err := strconv.Atoi(text)
		if err != nil {
			return 0, fmt.Errorf("--shard %s: %s is %q, which is no whole number", Slurm, name, text)
		}
		return v, nil
	}
	id, err1 := number("SLURM_ARRAY_TASK_ID", "")
	count, err2 := number("SLURM_ARRAY_TASK_COUNT", "")
	least, err3 := number("SLURM_ARRAY_TASK_MIN", "")
	most, err4 := number("SLURM_ARRAY_TASK_MAX", strconv.Itoa(least+count-1))
	step, err5 := number("SLURM_ARRAY_TASK_STEP", "1")
	if err := errors.Join(err1, err2, err3, err4, err5); err != nil {
		return Shard{}, firstOf(err1, err2, err3, err4, err5)
	}
	if step < 1 || count < 1 || count > maxShards || (most-least)/step+1 != count || (id-least)%step != 0 || id < least || id > most {
		return Shard{}, fmt.Errorf("--shard %s: task %d of an array of %d from %d to %d does not say which part it is; number the tasks without gaps, like sbatch --array=1-%d",
			Slurm, id, count, least, most, max(count, 1))
	}
	return Shard{(id-least)/step + 1, count}, nil
}

func firstOf(errs ...error) error {
	for _, err := range errs {
		if err != nil {
			return err
		}
	}
	return nil
}

// Whole reports whether the shard is the whole study.
func (s Shard) Whole() bool { return s.N <= 1 }

func (s Shard) String() string { return strconv.Itoa(s.I) + "/" + strconv.Itoa(s.N) }

// Part returns the runs of the shard, from first to before last, of so many.
func (s Shard) Part(runs int64) (first, last int64) {
	if s.Whole() {
		return 0, runs
	}
	i, n := int64(s.I), int64(s.N)
	return runs/n*(i-1) + runs%n*(i-1)/n, runs/n*i + runs%n*i/n
}

// Path is the file in which a shard keeps its part of the table:
// "study.3-of-7.csv" for "study.csv".
func (s Shard) Path(table string) string {
	if s.Whole() {
		return table
	}
	ext := filepath.Ext(table)
	return fmt.Sprintf("%s.%d-of-%d%s", strings.TrimSuffix(table, ext), s.I, s.N, ext)
}
