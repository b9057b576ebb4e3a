package tui

import (
	"flag"
	"fmt"
	"os"
	"path/filepath"
	"strings"
	"testing"

	"antelag/tui/canvas"
)

var update = flag.Bool("update", false, "write the golden screens anew")

// golden compares a screen with the one in testdata.
func golden(t *testing.T, name string, g *canvas.Grid) {
	t.Helper()
	file := filepath.Join("testdata", name+".txt")
	got := g.String() + "\n"
	if *update {
		if err := os.WriteFile(file, []byte(got), 0o644); err != nil {
			t.Fatal(err)
		}
		return
	}
	want, err := os.ReadFile(file)
	if err != nil {
		t.Fatal(err)
	}
	if got == string(want) {
		return
	}
	wanted := strings.Split(string(want), "\n")
	for i, line := range strings.Split(got, "\n") {
		if i >= len(wanted) || line != wanted[i] {
			t.Errorf("%s, line %d differs; look at the whole, then run with -update\n got %s\nwant %s",
				file, i+1, line, strings.Join(wanted[min(i, len(wanted)):min(i+1, len(wanted))], ""))
		}
	}
}

var samples = []struct {
	name string
	make func() *Snapshot
}{
	{"running", sampleRunningWell}, {"tripped", sampleTripped}, {"diverged", sampleDiverged}, {"paused", samplePaused}, {"at-rest", sampleAtRest},
	{"editing", sampleEditing}, {"refused", sampleRefused}, {"adaptive", sampleAdaptive}, {"driven", sampleDrivenTarget},
	{"lanes", sampleManyLanes}, {"start", sampleAtStart}, {"nothing", sampleNothing}, {"asking", sampleAsking},
	{"recorded", sampleRecorded},
}

func TestGoldenScreens(t *testing.T) {
	sizes := [][2]int{{80, 24}, {100, 30}, {120, 40}, {200, 60}, {81, 25}, {133, 37}}
	for _, sample := range samples {
		for _, size := range sizes {
			if size[0] != 80 && size[0] != 200 && sample.name != "running" && sample.name != "lanes" && sample.name != "tripped" {
				continue
			}
			a := sample.make().arranged()
			for v := range View(len(a.views)) {
				if v > 0 && (a.all(size[0], size[1]) || size[0] == 81) {
					continue
				}
				name := fmt.Sprintf("%s-%dx%d-%d", sample.name, size[0], size[1], v+1)
				t.Run(name, func(t *testing.T) {
					d, g := NewDashboard(), canvas.NewGrid(size[0], size[1])
					d.View = v
					d.Draw(sample.make(), g)
					golden(t, name, g)
				})
			}
		}
	}
}

func TestGoldenPages(t *testing.T) {
	for _, size := range [][2]int{{80, 24}, {120, 40}} {
		d, g := NewDashboard(), canvas.NewGrid(size[0], size[1])
		d.DrawHelp(g)
		golden(t, fmt.Sprintf("help-%dx%d", size[0], size[1]), g)
		d.DrawWelcome(sampleRunningWell(), g)
		golden(t, fmt.Sprintf("welcome-%dx%d", size[0], size[1]), g)
	}
	d, g := NewDashboard(), canvas.NewGrid(60, 20)
	d.Draw(sampleRunningWell(), g)
	golden(t, "toosmall-60x20", g)
}

// sizes are all kinds of screens from the smallest to beyond the largest.
func sizes(visit func(a *arrangement, w, h int, v View)) {
	for _, a := range []*arrangement{&loopArranged, &recordArranged} {
		for w := MinWidth; w <= 222; w += 7 {
			for h := MinHeight; h <= 72; h += 3 {
				for v := range a.views {
					visit(a, w, h, View(v))
				}
			}
		}
	}
}

// Panels tile the screen: every cell belongs to exactly one.
func TestPanelsTileTheScreen(t *testing.T) {
	sizes(func(a *arrangement, w, h int, v View) {
		owner := make([]panelID, w*h)
		for i := range owner {
			owner[i] = -1
		}
		for _, p := range a.places(w, h, v) {
			for y := p.y; y < p.y+p.h; y++ {
				for x := p.x; x < p.x+p.w; x++ {
					if x < 0 || y < 0 || x >= w || y >= h {
						t.Fatalf("%d×%d, %v: panel %d leaves the screen", w, h, v, p.panel)
					}
					if o := owner[y*w+x]; o >= 0 {
						t.Fatalf("%d×%d, %v: panels %d and %d both have cell %d, %d", w, h, v, o, p.panel, x, y)
					}
					owner[y*w+x] = p.panel
				}
			}
		}
		for i, o := range owner {
			if o < 0 {
				t.Fatalf("%d×%d, %v: no panel has cell %d, %d", w, h, v, i%w, i/w)
			}
		}
	})
}

// Between them the views show every panel, and where everything has room one
// view does.
func TestViewsShowEveryPanel(t *testing.T) {
	most := map[*arrangement]map[panelID]bool{}
	sizes(func(a *arrangement, w, h int, v View) {
		if most[a] == nil {
			most[a] = map[panelID]bool{}
		}
		for _, p := range a.places(w, h, v) {
			most[a][p.panel] = true
		}
	})
	sizes(func(a *arrangement, w, h int, v View) {
		seen := map[panelID]bool{}
		for v := range a.views {
			if v > 0 && a.all(w, h) {
				break
			}
			for _, p := range a.places(w, h, View(v)) {
				seen[p.panel] = true
			}
		}
		if len(seen) != len(most[a]) {
			t.Errorf("%d×%d: the views show %d of %d panels", w, h, len(seen), len(most[a]))
		}
	})
	all := map[panelID]bool{}
	for _, panels := range most {
		for p := range panels {
			all[p] = true
		}
	}
	if len(all) != int(panelCount) {
		t.Errorf("%d of %d panels are shown somewhere", len(all), panelCount)
	}
}

// Every panel has at least the rows that it needs to say what it is for.
func TestPanelsHaveRoom(t *testing.T) {
	least := map[panelID]rect{
		panelTrace: {w: 40, h: 7}, panelError: {w: 40, h: 5}, panelSubspace: {w: 28, h: 8}, panelEnergy: {w: 28, h: 5},
		panelEditor: {w: 30, h: 8}, panelVerdict: {w: 44, h: 8}, panelCurve: {w: 34, h: 7}, panelPace: {w: 28, h: 9},
		panelLanes: {w: 40, h: 5}, panelEvents: {w: 40, h: 3}, panelRecord: {w: 28, h: 7}, panelDelay: {w: 40, h: 7},
	}
	sizes(func(a *arrangement, w, h int, v View) {
		for _, p := range a.places(w, h, v) {
			if l := least[p.panel]; p.w < l.w || p.h < l.h {
				t.Errorf("%d×%d, %v: %s has %d×%d, needs %d×%d", w, h, v, panels[p.panel].title, p.w, p.h, l.w, l.h)
			}
		}
	})
}

// Whatever the snapshot and the size, drawing does not panic and every panel
// that is shown is headed by its title. One dashboard draws all sizes in turn,
// as when a terminal is resized.
func TestDrawEverySize(t *testing.T) {
	d, g := NewDashboard(), canvas.NewGrid(0, 0)
	made := make([]*Snapshot, len(samples))
	for i := range samples {
		made[i] = samples[i].make()
	}
	n := 0
	sizes(func(a *arrangement, w, h int, v View) {
		for n++; made[n%len(samples)].arranged() != a; n++ {
		}
		sample := samples[n%len(samples)]
		g.Resize(w, h)
		d.View = v
		d.Draw(made[n%len(samples)], g)
		rows := strings.Split(g.String(), "\n")
		for _, p := range a.places(w, h, v) {
			title := panels[p.panel].title
			row := []rune(rows[p.y])
			if title != "" && !strings.HasPrefix(string(row[min(p.x+2, len(row)):]), title) {
				t.Errorf("%s at %d×%d, %v: no title %q in row %d", sample.name, w, h, v, title, p.y)
			}
		}
	})
	for w := range MinWidth + 3 {
		for _, h := range []int{0, 1, 2, 3, 10, MinHeight - 1, MinHeight} {
			g.Resize(w, h)
			d.Draw(made[0], g)
			d.DrawHelp(g)
			d.DrawWelcome(made[0], g)
		}
	}
}

// An empty snapshot is drawn too: the first frame may come before anything is
// known.
func TestDrawEmptySnapshot(t *testing.T) {
	d := NewDashboard()
	for v := range views {
		d.View = v
		d.Draw(&Snapshot{}, canvas.NewGrid(80, 24))
	}
	d.Draw(&Snapshot{Lane: 5, Channel: -1, Editor: EditorView{Cursor: 9}}, canvas.NewGrid(200, 60))
}

// What is drawn is what is clicked on: the row of a lane selects that lane.
func TestHit(t *testing.T) {
	s := sampleManyLanes()
	for _, size := range [][2]int{{80, 24}, {120, 40}, {200, 60}} {
		seen := map[ActionKind]int{}
		for v := range views {
			d, g := NewDashboard(), canvas.NewGrid(size[0], size[1])
			d.View = v
			d.Draw(s, g)
			for y, row := range strings.Split(g.String(), "\n") {
				for x := range size[0] {
					a := d.Hit(x, y)
					seen[a.Kind]++
					named := ""
					switch a.Kind {
					case SelectLane:
						if y > 0 {
							named = s.Lanes[a.Index].Name[:4]
						}
					case SelectSetting:
						if named = "kind"; a.Index >= 0 {
							named = s.Editor.Settings[a.Index].Name
						}
					case SelectChannel:
						named = "channel"
						if a.Index != 2 {
							t.Errorf("a click on channel 1 of 0 to 2 selects %d", a.Index)
						}
					case NextView:
						named = v.String()
					}
					if !strings.Contains(row, named) {
						t.Errorf("%v: cell %d, %d is %+v, but its row is %q", size, x, y, a, row)
					}
				}
			}
			if a := d.Hit(-1, 0); a.Kind != None {
				t.Errorf("outside the screen there is %+v", a)
			}
		}
		if seen[SelectLane] == 0 || seen[SelectSetting] == 0 || seen[SelectChannel] == 0 || (seen[NextView] == 0) != allShown(size[0], size[1]) {
			t.Errorf("%v: cells by action: %v", size, seen)
		}
	}
}

// Axes hold still while data move inside them.
func TestScalesHoldStill(t *testing.T) {
	d, g := NewDashboard(), canvas.NewGrid(200, 60)
	s := sampleRunningWell()
	d.Draw(s, g)
	lo, hi := d.plots.traceScale.Bounds()
	for i := range s.Trace.Target {
		s.Trace.Target[i] *= 0.8
		s.Trace.Measured[i] *= 0.8
		s.Trace.Command[i] *= 0.8
	}
	d.Draw(s, g)
	if l, h := d.plots.traceScale.Bounds(); l != lo || h != hi {
		t.Errorf("the scale went from %g to %g to %g to %g", lo, hi, l, h)
	}
	s.Lane = 1
	d.Draw(s, g)
	if l, h := d.plots.traceScale.Bounds(); h-l > hi-lo {
		t.Errorf("another lane's scale, %g to %g, is not its own", l, h)
	}
}

func BenchmarkDraw200x60(b *testing.B) {
	d, g, s := NewDashboard(), canvas.NewGrid(200, 60), sampleManyLanes()
	b.ReportAllocs()
	for b.Loop() {
		d.Draw(s, g)
	}
}
