package scenarios

import (
	"fmt"
	"io"
	"strconv"
	"strings"

	"antelag/plant"
	"antelag/rtloop/excitation"
	"antelag/scenarios/kind"
	"antelag/scenarios/quantity"
)

// WriteTo writes the scenario as TOML with every value spelled out, so that
// reading it gives back the same scenario bit for bit. File names stay as they
// were written.
func (s *Scenario) WriteTo(w io.Writer) (int64, error) {
	p := &printer{driven: s.Excitation.Drives.Dim()}
	p.printf("title = %s\n", Quote(s.Title))
	p.section("[loop]", &loopSection, s.Loop)
	if sub := s.Substructure; sub != nil {
		p.section("[substructure]", sub.Kind, sub.Values)
		for _, v := range sub.Storeys {
			p.section("[[substructure.storey]]", &storeySection, v)
		}
	}
	p.printf("\n[excitation]\n")
	p.settings(&excitationSection, s.excitationValues())
	p.printf("kind = %s\n", Quote(s.Excitation.Kind.Name))
	p.settings(s.Excitation.Kind, s.Excitation.Part.Values)
	for _, c := range s.Channels {
		p.channel(c, s.Substructure != nil)
	}
	for _, l := range s.Lanes {
		p.printf("\n[[lane]]\nname = %s\n", Quote(l.Name))
		if l.Channel != "" {
			p.printf("channel = %s\n", Quote(l.Channel))
		}
		p.part("[lane.compensator]", l.Compensator)
	}
	p.section("[accept]", &acceptSection, s.Accept)
	s.writeSpread(p)
	n, err := io.WriteString(w, p.String())
	return int64(n), err
}

// excitationValues are the section's own settings; only a force has a level.
func (s *Scenario) excitationValues() kind.Values {
	if s.Excitation.Drives == excitation.Force {
		return s.Excitation.Values
	}
	own := kind.Values{}
	for k, v := range s.Excitation.Values {
		if k != "level" {
			own[k] = v
		}
	}
	return own
}

func (s *Scenario) writeSpread(p *printer) {
	if len(s.Spread) == 0 {
		return
	}
	p.printf("\n[spread]\n")
	for _, sp := range s.Spread {
		at, err := s.Locate(sp.Path)
		if err != nil {
			continue // reading has checked the path
		}
		low := exact(&at.Setting, sp.Low)
		high := exact(&at.Setting, sp.High)
		p.printf("%s = [%s, %s]\n", Quote(sp.Path), low, high)
	}
}

// printer writes sections in the form that the reader reads.
type printer struct {
	strings.Builder
	driven quantity.Dim
}

func (p *printer) printf(format string, args ...any) { fmt.Fprintf(p, format, args...) }

func (p *printer) channel(c Channel, between bool) {
	p.printf("\n[[channel]]\nname = %s\n", Quote(c.Name))
	if between {
		p.printf("between = [%d, %d]\n", c.Between[0], c.Between[1])
	}
	p.part("[channel.actuator]", c.Actuator)
	for _, e := range c.Specimen {
		p.part("[[channel.specimen]]", e)
	}
	p.part("[channel.compensator]", c.Compensator)
	p.section("[channel.sensor]", &plant.SensorSettings, c.Sensor)
	p.section("[channel.limits]", &limitsSection, c.Limits)
}

func (p *printer) part(header string, part Part) {
	p.printf("\n%s\nkind = %s\n", header, Quote(part.Kind.Name))
	p.settings(part.Kind, part.Values)
}

func (p *printer) section(header string, k *kind.Kind, v kind.Values) {
	if len(v) > 0 {
		p.printf("\n%s\n", header)
		p.settings(k, v)
	}
}

func (p *printer) settings(k *kind.Kind, v kind.Values) {
	for i := range k.Settings {
		setting := k.Settings[i].In(p.driven)
		if value, ok := v[setting.Name]; ok {
			p.printf("%s = %s\n", setting.Name, valueText(&setting, value))
		}
	}
}

// valueText writes a value as TOML that reads back the same.
func valueText(s *kind.Setting, v kind.Value) string {
	switch s.Type {
	case kind.WordType, kind.TextType:
		return Quote(v.Text)
	case kind.ListType:
		return list(s, v.List)
	case kind.MatrixType:
		width := len(v.List) / max(1, v.Rows)
		rows := make([]string, v.Rows)
		for i := range rows {
			rows[i] = list(s, v.List[i*width:(i+1)*width])
		}
		return "[" + strings.Join(rows, ", ") + "]"
	}
	return exact(s, v.Num)
}

func list(s *kind.Setting, values []float64) string {
	parts := make([]string, len(values))
	for i, x := range values {
		parts[i] = exact(s, x)
	}
	return "[" + strings.Join(parts, ", ") + "]"
}

func exact(s *kind.Setting, v float64) string {
	if s.Type == kind.IntegerType {
		return strconv.FormatFloat(v, 'f', -1, 64)
	}
	text := quantity.Exact(v, s.Dim)
	if s.Dim != quantity.None {
		return Quote(text)
	}
	return text
}

// Quote writes a TOML basic string.
func Quote(s string) string {
	var b strings.Builder
	b.WriteByte('"')
	for _, r := range s {
		switch {
		case r == '"' || r == '\\':
			b.WriteByte('\\')
			b.WriteRune(r)
		case r < 0x20 || r == 0x7f:
			fmt.Fprintf(&b, `\u%04X`, r)
		default:
			b.WriteRune(r)
		}
	}
	b.WriteByte('"')
	return b.String()
}
