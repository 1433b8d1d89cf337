#!/bin/sh
# SPDX-License-Identifier: GPL-3.0-or-later
# Installs what is needed, builds, and runs the main job beside a simulated meter: five standards, a check
# standard, eight samples, a closing check. Everything in it is invented. `--deps`: only install packages.
# Exit 0 only if the log of the run verifies and replays.
set -u
cd "$(dirname "$0")/.." || exit 2

packages="gcc cmake make pkg-config libserialport-dev libyaml-dev libgsl-dev libevent-dev libpcre2-dev
libjansson-dev libssl-dev libcmocka-dev"

install_packages() {
    missing=
    for p in $packages; do
        dpkg-query -W -f '${Status}' "$p" 2>/dev/null | grep -q 'ok installed' || missing="$missing $p"
    done
    [ -z "$missing" ] && return 0
    echo "Installing Debian packages:$missing"
    as_root=
    [ "$(id -u)" = 0 ] || as_root=sudo
    { $as_root apt-get update -qq && DEBIAN_FRONTEND=noninteractive $as_root apt-get install -y -qq $missing; } \
        >build-packages.log 2>&1 || { cat build-packages.log; rm -f build-packages.log; return 1; }
    rm -f build-packages.log
}

install_packages || { echo "The packages could not be installed." >&2; exit 2; }
[ "${1:-}" = --deps ] && exit 0

echo "Building (a minute or two the first time) …"
mkdir -p build
{ cmake -S . -B build && cmake --build build -j "$(nproc)" --target stillmarkd stillmark stillmark-replay stillmark-sim; } \
    >build/try-build.log 2>&1 || { tail -n 30 build/try-build.log; echo "The build failed." >&2; exit 2; }

bin=build/bin
work=$(mktemp -d "$PWD/build/try.XXXXXX") || exit 2
daemon= ; sim= ; watch=
stop() {
    for pid in $watch $sim $daemon; do kill "$pid" 2>/dev/null; done
    wait 2>/dev/null
}
trap stop EXIT
trap 'exit 2' INT TERM

cp -r conf "$work/conf"
sed -i "s|^port: .*|port: $work/meter|" "$work/conf/meters/try.yaml"
sock=$work/socket

$bin/stillmark-sim tests/sim/scenarios/try.scn --link "$work/meter" --wait --stay --events "$work/events.csv" --truth "$work/truth.csv" &
sim=$!
tries=0
until [ -e "$work/meter" ]; do
    tries=$((tries + 1)); [ $tries -gt 50 ] && { echo "The simulated meter did not start." >&2; exit 2; }
    sleep 0.1
done
$bin/stillmarkd --setup "$work/conf/try.yaml" --socket "$sock" 2>"$work/daemon.txt" &
daemon=$!
tries=0
until $bin/stillmark status --socket "$sock" >/dev/null 2>&1; do
    tries=$((tries + 1))
    if [ $tries -gt 100 ] || ! kill -0 $daemon 2>/dev/null; then
        cat "$work/daemon.txt" >&2; echo "The daemon did not start." >&2; exit 2
    fi
    sleep 0.1
done

cat <<'T'

A simulated meter is on a pseudo-terminal: ten readings a second from an electrode that responds in about
half a second. The method is made for this demonstration: a value is taken when the readings of the last
2 s lie within the tolerance and the probe has been in place for 3 s. Nobody touches anything: the probe
goes from beaker to beaker through air and rinse water. About two and a half minutes.

The meter, its bench sheet and the analyst are all called "try". What stands behind ± covers 95 % (of the
reading and the curve; not of the buffers themselves). A result is provisional until the next check has
passed; then it is released. Now "stillmark watch", while the sheet is handed over with "stillmark sheet":

T
$bin/stillmark analyst try --socket "$sock" >/dev/null || exit 2
$bin/stillmark watch --socket "$sock" &
watch=$!
$bin/stillmark sheet "$work/conf/sheets/try.yaml" --socket "$sock" >/dev/null || exit 2
tries=0
until $bin/stillmark status --json --socket "$sock" 2>/dev/null | grep -q '"sheet_done":true'; do
    tries=$((tries + 1))
    [ $tries -gt 180 ] && { echo "The sheet was not done within three minutes." >&2; break; }
    sleep 1
done
sleep 1
kill $watch 2>/dev/null; wait $watch 2>/dev/null; watch=
kill -TERM $daemon && wait $daemon
daemon=

log=$(ls "$work"/logs/try/*.jsonl | tail -n 1)
echo
echo "The results, as the log has them (the whole table: stillmark export, below):"
$bin/stillmark export "$log" >"$work/results.csv" || exit 1
tr -d '\r' <"$work/results.csv" | awk -F, '
    FILENAME != "-" { truth[$2] = $6; next } # of the simulator: name, true value
    FNR == 1 { for (i = 1; i <= NF; i++) at[$i] = i
               printf "  %-4s  %-14s  %-20s %-11s  %-11s  %s\n", "item", "sample", "result", "state", "temperature",
                      "simulated as"
               next }
    { printf "  %-4s  %-14s  %-20s  %-11s  %.1f °C      %.2f pH\n", $at["item"], $at["name"], $at["shown"],
             $at["state"], $at["temperature (°C)"], truth[$at["name"]] }' "$work/truth.csv" -
echo
echo "The log of it all:"
echo "$log"
echo
verified=0; replayed=0
echo "Is it as it was written and signed? (stillmark verify)"
$bin/stillmark verify "$log" || verified=1
echo
echo "Does the same come out when it is run again? (stillmark-replay)"
$bin/stillmark-replay "$log" || replayed=1
cat <<T

To look further:
  $bin/stillmark export $log
  $bin/stillmark export $log --captures
  $bin/stillmark export $log --curve
  $bin/stillmark export $log --readings
  $bin/stillmark verify $log
  $bin/stillmark-replay $log
  less $work/truth.csv        (what the simulator knows to be true)
The folder $work can be deleted.
Results are for information. They must not control a dosing pump.
T
[ $verified = 0 ] && [ $replayed = 0 ]
