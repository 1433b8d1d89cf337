#!/bin/sh
# SPDX-License-Identifier: GPL-3.0-or-later
# unit.sh: checks the files of systemd/ without starting anything: that the unit is well-formed, that its
# exposure as `systemd-analyze security` reckons it is at most 1.5 of 10, and that sysusers and tmpfiles make
# what the unit counts on (in a folder of their own, never on this machine).
#
#     sh tests/unit.sh [BUILD]      BUILD: a folder whose bin/stillmarkd stands in for the installed one
#
# One line per check, "ok what" or "FAILED what" and why. Exit 0 all ok, 1 one failed, 2 could not be run.
set -u
LC_ALL=C
export LC_ALL

most=15 # tenths: exposure 1.5

stand_in=/bin/true
if [ $# -gt 0 ]; then
    stand_in=$(cd "$1" 2>/dev/null && pwd)/bin/stillmarkd
    [ -x "$stand_in" ] || { echo "unit.sh: $1: no bin/stillmarkd there" >&2; exit 2; }
fi
cd "$(dirname "$0")/../systemd" || exit 2
for tool in systemd-analyze systemd-sysusers systemd-tmpfiles; do
    command -v $tool >/dev/null || { echo "unit.sh: $tool is not installed" >&2; exit 2; }
done
tmp=$(mktemp -d) || exit 2
trap 'rm -rf "$tmp"' EXIT
trap 'exit 2' HUP INT TERM
failed=0

# check WHAT STATUS: $tmp/out tells why.
check()
{
    if [ "$2" = 0 ]; then
        echo "ok $1"
        return
    fi
    failed=1
    echo "FAILED $1"
    sed 's/^/    /' "$tmp/out"
}

sed "s|^ExecStart=/usr/bin/stillmarkd |ExecStart=$stand_in |" stillmark.service >"$tmp/stillmark.service"
systemd-analyze verify --man=no "$tmp/stillmark.service" >"$tmp/out" 2>&1
status=$?
# a line it does not understand is only a warning to systemd
grep -q "$tmp/stillmark.service" "$tmp/out" && status=1
check "unit is well-formed" $status

systemd-analyze security --offline=true --no-pager --threshold=$most "$tmp/stillmark.service" >"$tmp/out" 2>&1
status=$?
exposure=$(sed -n 's/.*Overall exposure level for .*: \([0-9.]*\).*/\1/p' "$tmp/out")
[ -n "$exposure" ] || status=1
check "exposure ${exposure:-unknown}, at most $((most / 10)).$((most % 10))" $status

mkdir -p "$tmp/root/etc"
printf 'dialout:x:20:\n' >"$tmp/root/etc/group"
: >"$tmp/root/etc/passwd"
{
    systemd-sysusers --root="$tmp/root" "$PWD/stillmark.sysusers" &&
        grep -q '^stillmark:x:[0-9]*:[0-9]*:Stillmark bench daemon:/var/lib/stillmark:.*/nologin$' \
            "$tmp/root/etc/passwd" &&
        grep -q '^dialout:x:20:stillmark$' "$tmp/root/etc/group"
} >"$tmp/out" 2>&1
status=$?
[ $status = 0 ] || cat "$tmp/root/etc/passwd" "$tmp/root/etc/group" >>"$tmp/out"
check "sysusers makes the unit's user, a member of dialout" $status

if [ "$(id -u)" = 0 ]; then # owners can be set by root only
    {
        systemd-tmpfiles --root="$tmp/root" --create "$PWD/stillmark.tmpfiles" &&
            [ "$(stat -c %a "$tmp/root/var/lib/stillmark/logs")" = 750 ] &&
            [ "$(stat -c %a "$tmp/root/var/lib/stillmark/state")" = 700 ]
    } >"$tmp/out" 2>&1
    check "tmpfiles makes the folders of logs and key" $?
else
    echo "passed over: tmpfiles (only root can set owners)"
fi

# The installed udev may be older than `udevadm verify`; the shape of a rule can be checked anywhere.
grep -vE '^(#|$)' 60-stillmark.rules |
    grep -vE '^([A-Z]+(\{[A-Za-z_]+\})?(==|!=|=)"[^"]*"(, |$))+$' >"$tmp/out"
[ -s "$tmp/out" ]
check "udev rule has the shape of one" $((1 - $?))
exit $failed
