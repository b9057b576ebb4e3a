package handoff

// noneMethod: the command is the target.
var noneMethod = method{"none", func(tuned) code {
	return code{
		start:   "    (void)s; (void)x; (void)y;\n",
		prime:   "    (void)s; (void)in; (void)u;\n",
		command: "    (void)s;\n    return in->x;\n",

		roundings: 0, magnitude: func(p peaks) float64 { return p.x },
		reason: "nothing is computed",
	}
}}
