#!/bin/sh
# A sweep shared out by a real Slurm on this one machine: seven tasks of a job
# array, two of them at a time, one of them killed and requeued, then gathered
# and compared, byte for byte, with one sweep that was never shared out.
#
# Needs Debian's slurm-wlm and munge (apt-get install slurm-wlm munge) and root, as
# slurmd does. Everything it starts ends with it, and it writes only to a directory
# of its own and to that of the munge key if there is none.
#
#     .ci/slurm.sh [RUNS]
set -eu
runs=${1:-2000}
here=$(cd "$(dirname "$0")/.." && pwd)
work=$(mktemp -d)
host=$(hostname -s)
pids=

finish() {
    code=$?
    for pid in $pids; do kill "$pid" 2>/dev/null || true; done
    for pid in $pids; do wait "$pid" 2>/dev/null || true; done
    [ "$code" = 0 ] || tail -n 20 "$work"/*.log >&2 || true
    rm -rf "$work"
    exit "$code"
}
trap finish EXIT INT TERM

(cd "$here" && go build -o "$work/antelag" ./cmd/antelag)

# munge vouches for users; its key is this machine's own.
[ -e /etc/munge/munge.key ] || { mkdir -p /etc/munge; dd if=/dev/urandom of=/etc/munge/munge.key bs=1 count=1024 2>/dev/null; chown munge: /etc/munge/munge.key; chmod 400 /etc/munge/munge.key; }
mkdir -p /run/munge && chown munge: /run/munge && chmod 755 /run/munge
if ! munge -n >/dev/null 2>&1; then
    su munge -s /bin/sh -c 'exec munged --foreground' >"$work/munged.log" 2>&1 &
    pids="$pids $!"
fi

mkdir -p "$work/state" "$work/spool"
cat >"$work/slurm.conf" <<END
ClusterName=bench
SlurmctldHost=$host(127.0.0.1)
SlurmUser=root
SlurmdUser=root
AuthType=auth/munge
SlurmctldPort=16817
SlurmdPort=16818
StateSaveLocation=$work/state
SlurmdSpoolDir=$work/spool
SlurmctldPidFile=$work/slurmctld.pid
SlurmdPidFile=$work/slurmd.pid
ProctrackType=proctrack/linuxproc
TaskPlugin=task/none
SwitchType=switch/none
MpiDefault=none
SelectType=select/cons_tres
SelectTypeParameters=CR_Core
SchedulerType=sched/builtin
ReturnToService=2
JobRequeue=1
NodeName=$host NodeAddr=127.0.0.1 CPUs=$(nproc) State=UNKNOWN
PartitionName=all Nodes=$host Default=YES MaxTime=INFINITE State=UP
END
export SLURM_CONF="$work/slurm.conf"
slurmctld -D >"$work/slurmctld.log" 2>&1 &
pids="$pids $!"
sleep 1
slurmd -D -N "$host" >"$work/slurmd.log" 2>&1 &
pids="$pids $!"
tries=0
until sinfo -h -o %t 2>/dev/null | grep -q idle; do
    tries=$((tries + 1))
    [ "$tries" -lt 60 ] || { echo "slurm does not come up" >&2; exit 1; }
    sleep 1
done
sinfo

cd "$work"
sweep="$work/antelag sweep archive --set loop.duration=10s --draws $runs --csv study.csv"

# Exit 1 says that some runs fail their limits; for the array that is no failure.
cat >job.sh <<END
#!/bin/sh
#SBATCH --array=1-7 --ntasks=1 --cpus-per-task=1 --requeue
#SBATCH --output=task-%a.out --open-mode=append
$sweep --shard slurm --workers 1
[ \$? -le 1 ]
END
sbatch job.sh
job=$(squeue -h -o %A | head -n 1)
# Once task 2 has got somewhere, it is thrown out and begins again, where it was.
until [ -s study.2-of-7.csv ] && [ "$(wc -l <study.2-of-7.csv)" -gt 20 ]; do sleep 0.1; done
squeue
scontrol requeue "${job}_2" && echo "task 2 requeued after $(wc -l <study.2-of-7.csv) lines"
while squeue -h -t all -o %t | grep -qvE 'CD|F'; do sleep 1; done
squeue -t all -o "%.12i %.10j %.4t %.10M"

"$work/antelag" gather study.csv | sed -n 1,6p
mkdir whole && cd whole
$sweep >/dev/null || [ $? = 1 ]
for end in csv csv.toml; do cmp "study.$end" "../study.$end"; done
wc -lc study.csv
sha256sum study.csv ../study.csv
echo "the array and the one sweep wrote the same bytes"
