//go:build !linux

package pace

import "runtime"

func prepareThread(g *grants) (undo func(bool) bool) {
	g.say("no real-time priority: not supported on %s", runtime.GOOS)
	return func(bool) bool { return true }
}

func lockMemory(g *grants) (undo func()) {
	g.say("memory not locked: not supported on %s", runtime.GOOS)
	return func() {}
}

// What follows is of Linux alone.

const slice = 0

func thisThread() int                    { return 0 }
func raiseThread(int)                    {}
func raiseThreads(*grants, map[int]bool) {}
func lowerThread(int, uint64)            {}
func lowerThreads()                      {}

func shortenSlices(*grants) (undo func()) { return func() {} }
