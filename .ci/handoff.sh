#!/usr/bin/env bash
# Compiles what handoff writes, for every kind of compensator, as strictly as a
# compiler can be, and holds it to the Go code on fresh input.
#
#   .ci/handoff.sh [ANTELAG] [DRAWS] [SEED]
#
# ANTELAG is the program (default: it is built), DRAWS how many random settings of
# each kind are tried (default 2), SEED what they are drawn with (default: another
# one every time; it is printed).
set -euo pipefail
cd "$(dirname "$0")/.."
fail() { printf 'FAILED: %s\n' "$*" >&2; exit 1; }

work=$(mktemp -d)
trap 'rm -rf "$work"' EXIT
antelag=${1:-}
if [ -z "$antelag" ]; then
	antelag=$work/antelag
	go build -o "$antelag" ./cmd/antelag
fi
antelag=$(realpath "$antelag")
draws=${2:-2}
seed=${3:-$(od -An -N4 -tu4 /dev/urandom | tr -d ' ')}
compilers=()
for c in gcc clang; do
	if command -v "$c" >/dev/null; then compilers+=("$c"); else echo "no $c here: not tried"; fi
done
for c in make nm; do command -v "$c" >/dev/null || fail "there is no $c here"; done
[ ${#compilers[@]} -gt 0 ] || fail "neither gcc nor clang is there"
echo "seed $seed, compilers ${compilers[*]}"
strict=(-std=c99 -Wall -Wextra -Wpedantic -Wconversion -Wdouble-promotion -Wshadow -Wstrict-prototypes -Wmissing-prototypes -Werror -ffp-contract=off)

# A channel without limits, so that the input is as large as it is meant to be.
free=$work/free.toml
cat >"$free" <<'TOML'
title = "free */ /* <script>alert(1)</script> ??/ %s %HEADER% @ $ \\"
[loop]
rate = "2048 Hz"
duration = "1 s"
[excitation]
kind = "sine"
drives = "target"
amplitude = "10 mm"
frequency = "1 Hz"
[[channel]]
name = "damper"
[channel.actuator]
kind = "lag-delay"
delay = "8 ms"
[channel.compensator]
kind = "none"
TOML

# Settings to try, one line each: the kind if they are drawn, the scenario, then the
# changes, all split by tabs.
"$antelag" describe compensators --json >"$work/kinds.json"
/usr/bin/python3 - "$work/kinds.json" "$draws" "$seed" "$free" >"$work/cases" <<'PY'
import json, math, random, sys
kinds, draws, free = json.load(open(sys.argv[1]))["kinds"], int(sys.argv[2]), sys.argv[4]
random.seed(int(sys.argv[3]))

# A draw may contradict itself, so there are four for each that is wanted.
def case(scenario, kind, ticks, settings={}, drawn="-"):
    path = "damper.compensator."
    sets = [path + "kind=" + kind, f"loop.rate={ticks} Hz"]
    sets += [f"{path}{k}={v}" for k, v in settings.items()]
    print("\t".join([drawn, scenario] + sets))

def draw(s):
    if s.get("words"):
        return random.choice(s["words"])
    low, high = s["min"], s["max"]
    if s["name"] in ("order", "points"):
        return random.randint(low, high)
    v = random.choice([low, high]) if random.random() < 0.2 else \
        math.exp(random.uniform(math.log(max(low, high * 1e-4)), math.log(high)))
    return f"{v!r} {s.get('unit', '')}".strip()

for k in kinds:
    case("archive", k["name"], 2048)
    case(free, k["name"], 2048)
    for s in k["settings"]: # every word, every order
        values = s.get("words") or (range(int(s["min"]), int(s["max"]) + 1) if s["name"] == "order" else [])
        for v in values:
            case(free, k["name"], 2048, {s["name"]: v})
    if k["name"] == "adaptive-time-series": # so short that a sine is all it sees
        case(free, k["name"], 2048, {"window": "50 ms"})
    if k["name"] == "adaptive-inverse":
        case(free, k["name"], 2048, {"kp": 0, "ki": "1e5 m^-2*s^-1"})
    for _ in range(4 * draws if k["settings"] else 0):
        chosen = {s["name"]: draw(s) for s in k["settings"] if random.random() < 0.5}
        case(random.choice(["archive", free]), k["name"], random.choice([128, 500, 2048, 10000]), chosen, k["name"])
PY

# compiled NAME DIR COMPILER…: compiles a handoff strictly, in double and float,
# with the compilers, and under the sanitizers, and runs its self-test.
compiled() {
	local dir=$2 c real out=$work/program
	for c in "${@:3}"; do
		for real in "" -DANTELAG_FLOAT; do
			(cd "$dir" && "$c" "${strict[@]}" $real -O2 -o "$out" *.c) || fail "$1: $c $real does not compile it"
			(cd "$dir" && "$out" vectors.csv) >"$work/out" || { cat "$work/out"; fail "$1: $c $real: the self-test"; }
			sed "s/^/  $c${real:+ float}: /" "$work/out" >>"$work/report"
		done
	done
	for real in "" -DANTELAG_FLOAT; do
		(cd "$dir" && "${compilers[0]}" "${strict[@]}" $real -O1 -g -fsanitize=address,undefined -fno-sanitize-recover=all -o "$out" *.c) ||
			fail "$1: the sanitizers do not compile it"
		(cd "$dir" && "$out" vectors.csv) >"$work/out" 2>&1 || { cat "$work/out"; fail "$1: $real under the sanitizers"; }
	done
}

# What a source offers are its functions and nothing else; it calls nobody but its
# own: no allocation, no mathematical library, no variables.
alone() {
	local source
	for source in "$2"/antelag_*.c; do
		"${compilers[0]}" -std=c99 -O2 -c -o "$work/object" "$source"
		nm "$work/object" | awk '$(NF-1) ~ /^[A-Zbd]$/ && !/ T antelag_[a-z0-9_]*_(init|reset|prime|step)$/ && !/ U mem(cpy|set|move)$/ && !/ U _GLOBAL_OFFSET_TABLE_$/' >"$work/symbols"
		[ ! -s "$work/symbols" ] || { cat "$work/symbols"; fail "$1: more than its functions"; }
	done
}

tried=0 refused=0 number=0
declare -A drawn=()
while IFS=$'\t' read -r draw scenario rest; do
	[ "$draw" = - ] || [ "${drawn[$draw]:-0}" -lt "$draws" ] || continue
	number=$((number + 1))
	# Every compiler takes every kind; settings beyond that they take by turns.
	with=("${compilers[@]}")
	[[ "$scenario $rest" == "archive damper.compensator.kind="*"loop.rate=2048 Hz" ]] || with=("${compilers[number % ${#compilers[@]}]}")
	sets=()
	while IFS= read -r s; do sets+=(--set "$s"); done < <(tr '\t' '\n' <<<"$rest")
	dir="$work/hand over/$number"
	code=0
	"$antelag" handoff "$scenario" -o "$dir" --seed $((seed + number)) "${sets[@]}" >"$work/said" 2>"$work/complaint" || code=$?
	if [ $code = 2 ]; then # settings that contradict each other
		[ ! -e "$dir" ] || fail "$rest: refused, but written"
		refused=$((refused + 1))
		continue
	fi
	[ $code = 0 ] || { cat "$work/complaint"; fail "$rest"; }
	echo "$(basename "$scenario") $rest" >>"$work/report"
	compiled "$rest" "$dir" "${with[@]}"
	alone "$rest" "$dir"
	tried=$((tried + 1))
	[ "$draw" = - ] || drawn[$draw]=$((${drawn[$draw]:-0} + 1))
	rm -rf "$dir"
done <"$work/cases"
cat "$work/report"
echo "$tried settings tried, $refused contradicted themselves"
[ "$tried" -gt 20 ] || fail "too few settings could be tried"

# In the loop: what a run commanded, tick by tick with its noise, the C commands
# too, and the guard lets all of it through. (A log has no velocities, so these are
# the methods that need none.)
cat >"$work/replay.c" <<'C'
#include <math.h>
#include <stdio.h>
#include "antelag_damper.h"
int main(void)
{
    static antelag_damper_state s;
    antelag_damper_input in = {0.0, 0.0, 0.0, 0.0, 0.0};
    double t, ground, x, u, y, r, worst = 0.0, peak = 0.0;
    long rows = 0;
    if (scanf("%*[^\n]") != 0) return 2;
    while (scanf("%lf,%lf,%lf,%lf,%lf,%lf,%*[^\n]", &t, &ground, &x, &u, &y, &r) == 6) {
        in.x = x;
        if (rows++ == 0) {
            antelag_damper_init(&s);
            antelag_damper_reset(&s, x, y);
        } else {
            worst = fmax(worst, fabs(antelag_damper_step(&s, &in) - u));
        }
        peak = fmax(peak, fabs(u));
        in.y = y;
        in.r = r;
        if (s.flags != 0) return printf("flags %u in row %ld\n", s.flags, rows), 1;
    }
    printf("%ld ticks of a run, largest difference %.3g m of %.3g m\n", rows, worst, peak);
    return !(rows > 60000 && worst <= 1e-12 * peak);
}
C
for kind in none polynomial inverse least-squares-polynomial adaptive-inverse; do
	change=(--set "damper.compensator.kind=$kind")
	[ "$kind" = none ] || change+=(--set 'damper.compensator.delay=14 ms')
	"$antelag" run archive --log "$work/run.csv" --force "${change[@]}" >/dev/null || true # none fails its limits
	sed -i 's/,$/,0/' "$work/run.csv" # the margin is empty while it is undefined
	"$antelag" handoff archive -o "$work/replay" --force "${change[@]}" >/dev/null
	"${compilers[0]}" "${strict[@]}" -O2 -I "$work/replay" -o "$work/program" "$work/replay.c" "$work/replay/antelag_damper.c" -lm
	"$work/program" <"$work/run.csv" >"$work/out" || { cat "$work/out"; fail "$kind does not command what the run did"; }
	echo "$kind: $(cat "$work/out")"
done

# A self-test that cannot fail would prove nothing.
"$antelag" handoff archive -o "$work/broken" >/dev/null
sed -i 's/#define NOW R(4.0) /#define NOW R(4.000001) /' "$work/broken/antelag_damper.c"
make -s -C "$work/broken" test >"$work/out" 2>&1 && fail "a wrong weight passes the self-test"
grep -q FAILED "$work/out" || { cat "$work/out"; fail "a wrong weight does not say FAILED"; }

# Several channels, by the Makefile, in a path with spaces; and the same bytes again.
for again in one two; do
	"$antelag" handoff piperack -o "$work/pipe rack/$again" --lane high-adaptive >/dev/null
done
diff -r "$work/pipe rack/one" "$work/pipe rack/two" || fail "the same input, other bytes"
make -s -C "$work/pipe rack/one" test
make -s -C "$work/pipe rack/one" time STEPS=200000
(cd "$work/pipe rack/one" && sha256sum scenario.toml | cut -d' ' -f1 | xargs -I{} grep -q {} antelag_brace_low.h) || fail "the digest is not that of scenario.toml"
if command -v g++ >/dev/null; then
	printf '#include "antelag_brace_low.h"\n#include "antelag_brace_high.h"\nint main() { antelag_brace_low_state s; antelag_brace_low_init(&s); return 0; }\n' >"$work/pipe rack/one/main.cc"
	g++ -std=c++11 -Wall -Wextra -Werror -c -o "$work/object" "$work/pipe rack/one/main.cc"
fi
echo "handoff: all is well"
