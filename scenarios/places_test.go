package scenarios

import (
	"errors"
	"strings"
	"testing"
)

// What only shows when a scenario is built is placed as well as what reading
// finds: at the line of the setting that is to blame.
func TestBuildPlacesItsErrors(t *testing.T) {
	const text = `[loop]
rate = "1 kHz"
duration = "0.1 s"
[substructure]
integrator = "newmark-explicit"
[[substructure.storey]]
mass = "10 t"
stiffness = "5 kN/mm"
[[substructure.storey]]
mass = "10 t"
stiffness = "5 kN/mm"
[excitation]
kind = "sine"
amplitude = "1 m/s^2"
frequency = "2 Hz"
[[channel]]
[channel.actuator]
kind = "lag-delay"
[channel.compensator]
kind = "none"
`
	matrices := strings.NewReplacer(`[[substructure.storey]]
mass = "10 t"
stiffness = "5 kN/mm"
[[substructure.storey]]
mass = "10 t"
stiffness = "5 kN/mm"
`, `mass_matrix = [["10 t", "20 t"], ["20 t", "10 t"]]
stiffness_matrix = [["10 kN/mm", "-5 kN/mm"], ["-5 kN/mm", "5 kN/mm"]]
`)
	for _, c := range []struct {
		name    string
		text    string
		changes []Change
		want    string // the message, or how it begins
	}{
		{"a storey that cannot yield", strings.Replace(text, "stiffness = \"5 kN/mm\"\n[exc", "yield_displacement = \"5 mm\"\n[exc", 1), nil,
			"x.toml:11: substructure.storey.yield_displacement: a storey without stiffness cannot yield"},
		{"a matrix", matrices.Replace(text), nil, "x.toml:6: substructure.mass_matrix: the matrix is not positive definite"},
		{"what a kind cannot drive", text, []Change{{"excitation.kind", "release"}, {"excitation.drives", "force"}, {"excitation.amplitude", "1 mm"}},
			"--set excitation.drives: excitation.drives: release holds a level"},
		{"a step that is too long", text, []Change{{"loop.rate", "10 Hz"}, {"loop.duration", "1 s"}}, "--set loop.rate: loop.rate: the model step"},
	} {
		t.Run(c.name, func(t *testing.T) {
			s, err := Parse("x.toml", []byte(c.text), ".", c.changes...)
			if err == nil {
				_, err = s.Build()
			}
			var placed *Error
			if !errors.As(err, &placed) || !strings.HasPrefix(err.Error(), c.want) || strings.Contains(err.Error(), "\n") {
				t.Errorf("%v\nwant %s", err, c.want)
			}
		})
	}
}
