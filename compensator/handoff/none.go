package handoff

// noneMethod: the command is the target.
var noneMethod = method{"none", func(tuned) code {
	return code{
		start:   "    (void)s; (void)x; (void)y;\n",
		prime:   "    (void)s; (void)in; (void)u;\n",
		command: "    (void)s;\n    return in->x;\n",

		roundings: 0, terms: peaks{x: 1},
		reason: "nothing is computed",
	}
}}
