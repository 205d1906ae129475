#!/bin/sh
# demo.sh SIMULATE DATA: makes both demo jobs under the folder DATA; the same bytes each time.
set -eu
simulate=$1
data=$2
here=$(dirname "$0")
for job in fan blower; do
    mkdir -p "$data/$job"
    "$simulate" "$here/demo-$job.json" "$data/$job"
done
