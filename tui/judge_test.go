package tui

import (
	"context"
	"math"
	"testing"
	"time"

	"antelag/scenarios"
	"antelag/scenarios/accept"
	"antelag/scenarios/kind"
)

// delayQuestion is a question about the delay of a scenario's first channel.
func delayQuestion(t testing.TB, s *scenarios.Scenario, number int) question {
	t.Helper()
	alone, err := s.Alone(scenarios.Configured)
	if err != nil {
		t.Fatal(err)
	}
	k, err := alone.Channels[0].Compensator.Kind.Setting("delay")
	if err != nil {
		t.Fatal(err)
	}
	now := alone.Channels[0].Compensator.Values.Num("delay")
	return question{number: number, alone: alone, lane: scenarios.Configured,
		vary: &variation{setting: *k, at: []part{{own, 0}}, now: now, figure: "nrmse"}}
}

// collect takes the answers of one question until its curve is done.
func collect(t *testing.T, j *judge, number int) (verdict *accept.Lane, points []point) {
	t.Helper()
	for {
		select {
		case a := <-j.answers:
			if a.err != nil {
				t.Fatal(a.err)
			}
			if a.number != number {
				continue
			}
			if a.verdict != nil {
				verdict = a.verdict
			}
			points = append(points, a.points...)
			if a.done {
				return verdict, points
			}
		case p := <-j.failed:
			t.Fatal(p)
		case <-time.After(time.Minute):
			t.Fatal("no answer")
		}
	}
}

// The verdict is that of a run, and so is every point of the curve.
func TestJudgeSaysWhatARunSays(t *testing.T) {
	s := short(t)
	j := newJudge()
	defer j.close()
	j.ask(delayQuestion(t, s, 1))
	verdict, points := collect(t, j, 1)
	nrmse := func(s *scenarios.Scenario) float64 {
		v, err := accept.Run(context.Background(), s, accept.Options{})
		if err != nil {
			t.Fatal(err)
		}
		return float64(v.Lanes[0].Channels[0].NRMSE)
	}
	if got, want := float64(verdict.Channels[0].NRMSE), nrmse(s); got != want {
		t.Errorf("verdict %g, run %g", got, want)
	}
	if len(points) < 15 || len(points) > 25 {
		t.Errorf("%d points, meant about 21", len(points))
	}
	best := points[0]
	for _, p := range points {
		delay, err := s.With(part{own, 0}.change(&aDelay, kind.Num(p.x)))
		if err != nil {
			t.Fatal(err)
		}
		got, _ := p.lane.Figure("nrmse")
		if want := nrmse(delay); got != want {
			t.Errorf("at %g s: %g, run %g", p.x, got, want)
		}
		if score(&p, "nrmse") < score(&best, "nrmse") {
			best = p
		}
	}
	// The actuator is 8 ms and a lag of 6 ms late; a lag is a delay of that
	// size for slow motions.
	if math.Abs(best.x-0.014) > 0.002 {
		t.Errorf("best at %g s, the actuator is 0.014 s late", best.x)
	}
}

// A question that has been overtaken gives no answers any more.
func TestNewQuestionCancelsTheLast(t *testing.T) {
	s := load(t, "archive", "loop.duration=600 s")
	j := newJudge()
	defer j.close()
	j.ask(delayQuestion(t, s, 1))
	j.ask(delayQuestion(t, s, 2))
	j.ask(delayQuestion(t, short(t), 3))
	if verdict, points := collect(t, j, 3); verdict == nil || len(points) == 0 {
		t.Error("the newest question was not answered")
	}
	select {
	case a := <-j.answers:
		t.Errorf("question %d was answered after it was overtaken", a.number)
	case <-time.After(50 * time.Millisecond):
	}
}

func TestPanicOfTheJudgeIsCaught(t *testing.T) {
	j := newJudge()
	defer j.close()
	j.ask(question{number: 1})
	select {
	case p := <-j.failed:
		if p.Where != "the verdict" || len(p.Stack) == 0 {
			t.Errorf("got %+v", p)
		}
	case <-time.After(time.Minute):
		t.Error("the panic did not arrive")
	}
}

func TestCurveStaysInTheRange(t *testing.T) {
	for _, c := range []struct {
		s         kind.Setting
		now       float64
		low, high float64
	}{
		{aDelay, 0.014, 0, 0.028},
		{aDelay, 0.4, 0, 0.5},
		{aGain, 1, 0.5, 2},
		{anOrder, 3, 0, 4},
		{anOrder, 0, 0, 4},
	} {
		v := variation{setting: c.s, now: c.now}
		if lo, hi := v.bounds(); lo != c.low || hi != c.high {
			t.Errorf("%s at %g: %g to %g, want %g to %g", c.s.Name, c.now, lo, hi, c.low, c.high)
		}
	}
	if lo, hi := (&variation{setting: aDelay}).bounds(); lo != 0 || !(hi > 0) {
		t.Errorf("around nothing: %g to %g", lo, hi)
	}
}
