package scenarios

import (
	"errors"
	"strconv"

	"antelag/scenarios/kind"
	"antelag/scenarios/quantity"
)

// spread reads the [spread] section: how far settings may be from their
// values, as a fraction either way or as a pair of values.
func (r *reader) spread(s *Scenario, t map[string]any) []Spread {
	var out []Spread
	for _, path := range sortedKeys(t) {
		at := "spread." + path
		found, err := s.Locate(path)
		if err != nil {
			r.fail(at, err)
			return nil
		}
		setting := found.Setting
		value, has := found.Values[setting.Name]
		if setting.Type != kind.NumberType || !has {
			r.fail(at, errors.New("is not a number that the scenario sets; only those can spread"))
			return nil
		}
		sp := Spread{Path: path}
		if pair, ok := t[path].([]any); ok {
			sp.Low, sp.High, err = readPair(&setting, pair)
		} else {
			sp.Low, sp.High, err = readFraction(value.Num, t[path])
		}
		for _, end := range []float64{sp.Low, sp.High} {
			if err == nil {
				err = setting.Check(kind.Num(end))
			}
		}
		if err != nil {
			r.fail(at, err)
			return nil
		}
		out = append(out, sp)
	}
	return out
}

func readPair(setting *kind.Setting, pair []any) (low, high float64, err error) {
	if len(pair) != 2 {
		return 0, 0, errors.New("has " + strconv.Itoa(len(pair)) + " values; a spread is a fraction like 0.2, or [low, high]")
	}
	var v [2]kind.Value
	for i := range v {
		if v[i], err = setting.Read(pair[i]); err != nil {
			return 0, 0, err
		}
	}
	if v[0].Num > v[1].Num {
		return 0, 0, errors.New("has its low end above its high end")
	}
	return v[0].Num, v[1].Num, nil
}

// spreadFraction is what a spread given as a fraction may be.
var spreadFraction = kind.Number("spread", quantity.None, "fraction either way").Range(0, 1)

func readFraction(value float64, raw any) (low, high float64, err error) {
	f, err := spreadFraction.Read(raw)
	if err != nil {
		return 0, 0, err
	}
	low, high = value*(1-f.Num), value*(1+f.Num)
	return min(low, high), max(low, high), nil
}
