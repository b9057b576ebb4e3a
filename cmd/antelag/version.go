package main

import (
	"fmt"
	"runtime"
	"runtime/debug"

	"github.com/spf13/cobra"
)

// release is the version of a release; the linker sets it (-X main.release=…).
var release = ""

// version tells a release from a build of some commit.
func version() string {
	if release != "" {
		return release
	}
	info, ok := debug.ReadBuildInfo()
	if !ok {
		return "unknown"
	}
	v, commit, modified := info.Main.Version, "", ""
	for _, s := range info.Settings {
		switch {
		case s.Key == "vcs.revision" && len(s.Value) >= 12:
			commit = " " + s.Value[:12]
		case s.Key == "vcs.modified" && s.Value == "true":
			modified = " modified"
		}
	}
	if v == "" || v == "(devel)" {
		v = "development"
	}
	return v + commit + modified
}

func newVersion() *cobra.Command {
	return &cobra.Command{
		Use:   "version",
		Short: "print the version",
		Args:  noArgument,
		RunE: func(cmd *cobra.Command, _ []string) error {
			_, err := fmt.Fprintf(cmd.OutOrStdout(), "antelag %s, %s %s/%s\n", version(), runtime.Version(), runtime.GOOS, runtime.GOARCH)
			return err
		},
	}
}
