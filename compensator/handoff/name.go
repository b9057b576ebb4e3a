package handoff

import (
	"strconv"
	"strings"
)

// prefix stands before every name in the C, so that no channel's name can be a
// keyword, a reserved name, a name of the library or of a file that an operating
// system keeps for itself.
const prefix = "antelag_"

// longestName is how much of a channel's name goes into its C name.
const longestName = 40

// identifiers makes a C identifier, which is also a file name, of every
// channel's name. Capitals become small, because there are file systems that do
// not tell them apart, and what no identifier may have becomes "_"; names that
// thereby come to the same are numbered.
func identifiers(channels []Channel) []string {
	out := make([]string, len(channels))
	taken := map[string]bool{}
	for i, c := range channels {
		base := identifier(c.Name)
		name := base
		for n := 2; taken[name]; n++ {
			name = base + "_" + strconv.Itoa(n)
		}
		taken[name] = true
		out[i] = prefix + name
	}
	return out
}

func identifier(name string) string {
	var b strings.Builder
	for _, r := range strings.ToLower(name) {
		switch {
		case b.Len() == longestName:
		case 'a' <= r && r <= 'z' || '0' <= r && r <= '9':
			b.WriteRune(r)
		default:
			b.WriteByte('_')
		}
	}
	if b.Len() == 0 {
		return "channel"
	}
	return b.String()
}

// letters are the symbols of equations and units in ASCII, because compilers
// and editors of laboratories are old.
var letters = strings.NewReplacer(
	"iτ", "i*tau", "τ", "tau", "α", "alpha", "β", "beta", "κ", "kappa", "λ", "lambda", "ω", "omega", "ζ", "zeta", "ε", "eps",
	"Σ", "sum", "∫", "integral of ", "·", "*", "−", "-", "–", "-", "—", "-", "×", "x", "≤", "<=", "≥", ">=", "±", "+-", "√", "sqrt",
	"₀", "0", "₁", "1", "₂", "2", "₃", "3", "ᵢ", "_i", "⁻¹", "^-1", "⁻²", "^-2", "²", "^2", "³", "^3", "ⁿ", "^n", "µ", "u",
	"Ÿ", "Y''", "Ẏ", "Y'", "…", "..", "é", "e", "ü", "u", "ö", "o", "ä", "a")

// plain makes one line of ASCII, safe inside a C comment, of any text: what is
// no ASCII is written as an escape, and what opens or closes a comment, or is a
// trigraph, is taken apart.
func plain(text string) string {
	text = strconv.QuoteToASCII(text)
	return apart(text[1 : len(text)-1])
}

// quoted is plain in quotation marks, for texts of people. They stand to the end,
// so that no line ends in a backslash.
func quoted(text string) string { return apart(strconv.QuoteToASCII(text)) }

func apart(text string) string {
	for _, pair := range []string{"*/", "/*", "??"} {
		for strings.Contains(text, pair) {
			text = strings.ReplaceAll(text, pair, pair[:1]+" "+pair[1:])
		}
	}
	return text
}

// comment writes paragraphs as the lines of a C comment, each no longer than a
// page is wide where its words allow. A paragraph that begins with two spaces
// hangs.
func comment(paragraphs ...string) string {
	var b strings.Builder
	b.WriteString("/*\n")
	for _, p := range paragraphs {
		if p == "" {
			b.WriteString(" *\n")
			continue
		}
		for _, line := range wrap(p, 76) {
			b.WriteString(strings.TrimRight(" * "+line, " ") + "\n")
		}
	}
	b.WriteString(" */\n")
	return b.String()
}

// wrap breaks a text at spaces. Continued lines stand two spaces further in than
// the first, where that was set in.
func wrap(text string, width int) []string {
	indent := text[:len(text)-len(strings.TrimLeft(text, " "))]
	further := indent
	if indent != "" {
		further += "  "
	}
	var lines []string
	line := indent
	for i, word := range strings.Fields(text) {
		switch {
		case i == 0:
			line += word
		case len(line)+1+len(word) > width:
			lines = append(lines, line)
			line = further + word
		default:
			line += " " + word
		}
	}
	return append(lines, line)
}
