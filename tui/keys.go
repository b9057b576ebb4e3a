package tui

import (
	"slices"
	"unicode"

	"github.com/gdamore/tcell/v2"

	"antelag/compensator"
)

// key takes one key. What a key does depends on what has the keys: a question,
// the text that is being typed, a page that covers the screen, or the dashboard.
func (a *app) key(ev *tcell.EventKey) {
	if ev.Key() == tcell.KeyCtrlC {
		a.quit = true
		return
	}
	s := a.session
	switch {
	case s.prompt != nil:
		a.keyPrompt(ev)
	case a.page != pageDashboard:
		a.keyPage(ev)
	case s.editing:
		s.keyTyping(ev)
	default:
		s.message = ""
		a.keyDashboard(ev)
	}
}

// keyPage leaves the first screen, which begins the run, or the help.
func (a *app) keyPage(ev *tcell.EventKey) {
	if ev.Key() == tcell.KeyRune && ev.Rune() == 'q' && a.page == pageWelcome {
		a.quit = true
		return
	}
	if a.page == pageWelcome {
		a.session.setPaused(false)
	}
	a.page = pageDashboard
}

func (a *app) keyDashboard(ev *tcell.EventKey) {
	s := a.session
	big := ev.Modifiers()&tcell.ModShift != 0
	switch ev.Key() {
	case tcell.KeyUp:
		s.moveCursor(-1)
	case tcell.KeyDown:
		s.moveCursor(1)
	case tcell.KeyHome:
		s.setCursor(-1)
	case tcell.KeyEnd:
		s.setCursor(1 << 20)
	case tcell.KeyLeft:
		s.nudge(false, big)
	case tcell.KeyRight:
		s.nudge(true, big)
	case tcell.KeyEnter:
		s.beginTyping()
	case tcell.KeyEscape:
		s.problem = ""
		s.cancelCopy()
	case tcell.KeyTab:
		s.show(s.lane+1, s.channel)
	case tcell.KeyBacktab:
		s.show(s.lane-1, s.channel)
	case tcell.KeyRune:
		a.rune(ev.Rune())
	}
}

func (a *app) rune(r rune) {
	s := a.session
	switch r {
	case 'q':
		a.quit = true
	case '?', 'h':
		a.page = pageHelp
	case ' ':
		s.setPaused(!s.paused)
	case '.':
		s.single()
	case 'r':
		s.restart()
	case '+':
		s.setSpeed(2)
	case '-':
		s.setSpeed(0.5)
	case '=':
		s.setSpeed(0)
	case 'l':
		s.show(s.lane+1, s.channel)
	case 'L':
		s.show(s.lane-1, s.channel)
	case 'c':
		s.show(s.lane, s.channel+1)
	case 'k', 'n':
		s.copyLane()
	case 'u':
		s.undoLast()
	case 'v':
		a.board.View = a.board.View.Next()
	case 'f':
		s.nextFigure()
	case 'w':
		s.askWrite()
	case 's', 'p':
		s.say("%s", screenshot(a.grid))
	default:
		s.say("no key %q; ? shows the keys", r)
	}
}

// single does one tick of a paused run.
func (s *session) single() {
	if !s.paused {
		s.say("single ticks are for a paused run: press space first")
		return
	}
	s.send(command{do: stepOnce})
}

func (s *session) moveCursor(by int) { s.setCursor(s.cursor + by) }

func (s *session) setCursor(i int) {
	was := s.cursor
	s.cursor = i
	s.clampCursor()
	s.problem = ""
	if s.cursor != was {
		s.askAll()
	}
}

// nudge moves the setting under the cursor by a step, or the kind to the next.
func (s *session) nudge(up, big bool) {
	s.problem = ""
	k := s.setting()
	if k == nil {
		all := compensator.Kinds.Names()
		i := slices.Index(all, s.part().in(s.now).Kind.Name)
		step := 1
		if !up {
			step = -1
		}
		s.complain(s.setKind(all[(i+step+len(all))%len(all)]))
		return
	}
	v, given := s.part().in(s.now).Values[k.Name]
	if !given {
		s.say("%s is not set: press enter and type it", k.Name)
		return
	}
	next, err := nudge(k, v, up, big)
	if err != nil {
		s.say("%v", err)
		return
	}
	s.complain(s.editSetting(next))
}

// complain shows why an edit was refused, where it was made.
func (s *session) complain(err error) {
	if err != nil {
		s.problem = err.Error()
	}
}

// beginTyping opens the setting under the cursor, or the kind, for typing.
func (s *session) beginTyping() {
	in := s.part().in(s.now)
	s.editing, s.problem, s.typing = true, "", in.Kind.Name
	if k := s.setting(); k != nil {
		s.typing = ""
		if v, given := in.Values[k.Name]; given {
			s.typing = typable(k, v)
		}
	}
}

// keyTyping takes a key while a setting is typed.
func (s *session) keyTyping(ev *tcell.EventKey) {
	switch ev.Key() {
	case tcell.KeyEscape:
		s.editing, s.problem = false, ""
	case tcell.KeyEnter:
		s.apply()
	case tcell.KeyUp, tcell.KeyDown:
		s.say("enter applies what is typed, esc leaves it as it was")
	default:
		if typeInto(&s.typing, ev) {
			s.problem = ""
		}
	}
}

// apply takes what was typed. What is refused stays, to be put right.
func (s *session) apply() {
	k := s.setting()
	var err error
	if k == nil {
		err = s.setKind(s.typing)
	} else {
		v, wrong := readTyped(k, s.typing)
		if err = wrong; err == nil {
			err = s.editSetting(v)
		}
	}
	s.editing = err != nil
	s.problem = ""
	s.complain(err)
}

// longestTyped bounds what is typed, runes.
const longestTyped = 200

// typeInto changes a line of text by a key and reports whether it did.
func typeInto(text *string, ev *tcell.EventKey) bool {
	line := []rune(*text)
	switch ev.Key() {
	case tcell.KeyBackspace, tcell.KeyBackspace2, tcell.KeyDelete:
		if len(line) == 0 {
			return false
		}
		line = line[:len(line)-1]
	case tcell.KeyCtrlU:
		line = nil
	case tcell.KeyRune:
		if len(line) >= longestTyped || !unicode.IsPrint(ev.Rune()) {
			return false
		}
		line = append(line, ev.Rune())
	default:
		return false
	}
	*text = string(line)
	return true
}

// keyPrompt takes a key while a question is asked.
func (a *app) keyPrompt(ev *tcell.EventKey) {
	s := a.session
	switch ev.Key() {
	case tcell.KeyEscape:
		s.prompt = nil
		s.say("nothing written")
	case tcell.KeyEnter:
		text, answer := s.prompt.Text, s.answer
		s.prompt, s.answer = nil, nil
		answer(text)
	default:
		typeInto(&s.prompt.Text, ev)
	}
}

// ask puts a question on the bottom line.
func (s *session) ask(question, text string, answer func(string)) {
	s.prompt, s.answer = &Prompt{Question: question, Text: text}, answer
}

// mouse takes a click.
func (a *app) mouse(ev *tcell.EventMouse) {
	s := a.session
	hit, clicked := a.clicked(ev)
	wheel := ev.Buttons() & (tcell.WheelUp | tcell.WheelDown)
	if s.prompt != nil || s.editing || !clicked && wheel == 0 {
		return
	}
	if a.page != pageDashboard {
		if clicked {
			a.keyPage(tcell.NewEventKey(tcell.KeyEnter, 0, tcell.ModNone))
		}
		return
	}
	s.message = ""
	if wheel != 0 {
		s.moveCursor(map[bool]int{true: -1, false: 1}[wheel&tcell.WheelUp != 0])
		return
	}
	switch hit.Kind {
	case SelectLane:
		s.show(hit.Index, s.channel)
	case SelectChannel:
		s.show(s.lane, hit.Index)
	case SelectSetting:
		s.setCursor(hit.Index)
	case NextView:
		a.board.View = a.board.View.Next()
	}
}
