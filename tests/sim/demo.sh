#!/bin/sh
# demo.sh SIMULATE DATA: makes the demo jobs under the folder DATA; the same bytes each time.
set -eu
simulate=$1
data=$2
here=$(dirname "$0")
for job in fan blower; do
    mkdir -p "$data/$job"
    "$simulate" "$here/demo-$job.json" "$data/$job"
done

# The fan's correction run; its sheet names the recordings of before as well.
scratch=$(mktemp -d)
trap 'rm -rf "$scratch"' EXIT
"$simulate" "$here/demo-fan-after.json" "$scratch"
mkdir -p "$data/fan-after"
cp "$scratch/correction.wav" "$data/fan-after/correction.wav"
cp "$here/demo-fan-after.ini" "$data/fan-after/job.ini"
