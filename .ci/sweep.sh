#!/bin/sh
# What a large sweep costs and whether it holds together: speed with one worker and
# with two, memory over the length of the study, killed and gone on with against
# never killed, seven shards gathered against one run, all to the byte.
#
#     .ci/sweep.sh [RUNS]      (default 2000; 100000 is the real thing)
#
# Needs GNU time (Debian: time).
set -eu
runs=${1:-2000}
here=$(cd "$(dirname "$0")/.." && pwd)
work=$(mktemp -d)
trap 'rm -rf "$work"' EXIT
(cd "$here" && go build -o "$work/antelag" ./cmd/antelag)
cd "$work"
sweep() { # draws, further flags
    draws=$1
    shift
    ./antelag sweep archive --set loop.duration=10s --draws "$draws" "$@"
}
costs() { # draws, workers: the line that says so, and the most memory
    /usr/bin/time -f '%M KB at most, %U s of processor time' -o cost ./antelag sweep archive --set loop.duration=10s --draws "$1" --csv "$1-$2.csv" --workers "$2" >out || [ $? = 1 ]
    echo "$(sed -n 3p out)"
    echo "    $(tail -n 1 cost)"
}
echo "== memory over the length, two workers"
for n in $((runs / 20)) $((runs / 4)) "$runs"; do costs "$n" 2; done
echo "== one worker"
costs $((runs / 4)) 1
cmp $((runs / 4))-1.csv $((runs / 4))-2.csv && echo "one worker and two write the same bytes"
mv "$runs-2.csv" whole.csv
mv "$runs-2.csv.toml" whole.csv.toml

echo "== killed five times and gone on with"
for k in 1 2 3 4 5; do
    ./antelag sweep archive --set loop.duration=10s --draws "$runs" --csv killed.csv >/dev/null 2>&1 &
    pid=$! # of the program itself
    want=$((runs * k / 6))
    until [ -e killed.csv ] && [ "$(wc -l <killed.csv)" -gt "$want" ]; do sleep 0.05; done
    kill -KILL "$pid"
    wait "$pid" 2>/dev/null || true
    echo "killed after $(wc -l <killed.csv) lines, $(wc -c <killed.csv) bytes"
done
sweep "$runs" --csv killed.csv | sed -n 3p
cmp killed.csv whole.csv && cmp killed.csv.toml whole.csv.toml && echo "the same bytes as never killed"

echo "== seven shards gathered"
for i in 1 2 3 4 5 6 7; do sweep "$runs" --csv shards.csv --shard "$i/7" >/dev/null || [ $? = 1 ]; done
./antelag gather shards.csv | sed -n 5p
cmp shards.csv whole.csv && cmp shards.csv.toml whole.csv.toml && echo "the same bytes as one run"
sha256sum whole.csv killed.csv shards.csv
