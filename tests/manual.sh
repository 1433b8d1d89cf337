#!/bin/sh
# SPDX-License-Identifier: GPL-3.0-or-later
# manual.sh: checks the manual pages of daemon/man/: that the formatter has nothing to complain about, that
# every option a program's --help names stands in its page, and every key of a setup file in stillmark-setup.
#
#     sh tests/manual.sh BUILD      BUILD: a folder whose bin/ holds the programs
#
# One line per check, "ok what" or "FAILED what" and why. Exit 0 all ok, 1 one failed, 2 could not be run.
set -u
LC_ALL=C.UTF-8
export LC_ALL

if [ $# -ne 1 ] || [ ! -x "$1/bin/stillmark" ]; then
    echo "usage: sh tests/manual.sh BUILD, where BUILD/bin holds the programs" >&2
    exit 2
fi
bin=$(cd "$1/bin" && pwd) || exit 2
cd "$(dirname "$0")/.." || exit 2
command -v man >/dev/null && command -v groff >/dev/null || { echo "manual.sh: man is not installed" >&2; exit 2; }
tmp=$(mktemp -d) || exit 2
trap 'rm -rf "$tmp"' EXIT
trap 'exit 2' HUP INT TERM
failed=0

# report WHAT: $tmp/out holds what is wrong.
report()
{
    if [ ! -s "$tmp/out" ]; then
        echo "ok $1"
        return
    fi
    failed=1
    echo "FAILED $1"
    sed 's/^/    /' "$tmp/out"
}

# missing FILE PAGE: the words of FILE that do not stand in the page as a whole.
missing()
{
    while read -r word; do
        grep -qE -- "(^|[^a-zA-Z0-9-])$word([^a-zA-Z0-9-]|$)" "$2" || echo "$word"
    done <"$1"
}

for page in daemon/man/*.[1-9]; do
    MANWIDTH=100 man --warnings -E UTF-8 -l -Tutf8 -Z "$page" 2>"$tmp/out" >/dev/null
    report "$page is formatted without a warning"
    MANWIDTH=1000 man --nh --nj -E UTF-8 -l "$page" 2>/dev/null | sed 's/‐/-/g' >"$tmp/$(basename "$page")"
done

# The options of a program and of its commands.
: >"$tmp/help"
for command in status watch sheet next note fit profile export verify; do
    "$bin/stillmark" $command --help >>"$tmp/help" 2>&1 || echo "stillmark $command --help fails" >>"$tmp/bad"
done
grep -oE -- '--[a-z][a-z-]*' "$tmp/help" | grep -vx -- '--help' | sort -u >"$tmp/words"
{ [ -s "$tmp/words" ] || echo "no option found"; cat "$tmp/bad" 2>/dev/null; missing "$tmp/words" "$tmp/stillmark.1"; } >"$tmp/out"
report "stillmark.1 names every option"

"$bin/stillmark" --help | sed -n 's/^  \([a-z].*[a-z]\)  .*/\1/p' >"$tmp/help"
"$bin/stillmark" --help | sed -n '/redo/p;/report/p' >>"$tmp/help"
grep -oE '(^|[ ,])[a-z]+' "$tmp/help" | tr -d ' ,' | sort -u >"$tmp/words"
{ [ "$(wc -l <"$tmp/words")" -gt 20 ] || echo "too few commands found"; missing "$tmp/words" "$tmp/stillmark.1"; } >"$tmp/out"
report "stillmark.1 names every command"

for program in stillmarkd:8 stillmark-replay:1; do
    name=${program%:*}
    "$bin/$name" --help >"$tmp/help"
    [ "$name" = stillmark-replay ] && "$bin/$name" trace --help >>"$tmp/help"
    grep -oE -- '--[a-z][a-z-]*' "$tmp/help" | sort -u >"$tmp/words"
    { [ -s "$tmp/words" ] || echo "no option found"; missing "$tmp/words" "$tmp/$name.${program#*:}"; } >"$tmp/out"
    report "$name.${program#*:} names every option"
done

# The lists of keys in the sources: `…keys[] = { "logs", … NULL };`
awk '/char \*const (after_keys|once|keys)\[\]/ { on = 1 } on { print } /};/ { on = 0 }' lib/setup/*.c |
    grep -oE '"[^"]+"' | tr -d '"' | sort -u >"$tmp/words"
{ [ "$(wc -l <"$tmp/words")" -gt 80 ] || echo "only $(wc -l <"$tmp/words") keys found in lib/setup"; missing "$tmp/words" "$tmp/stillmark-setup.5"; } >"$tmp/out"
report "stillmark-setup.5 names every key"

# What must be said.
{
    for page in "$tmp"/*.[1-9]; do
        grep -q 'must not control a dosing pump' "$page" || echo "$(basename "$page"): not that results must not control a dosing pump"
        grep -qi 'simulated signals' "$page" || echo "$(basename "$page"): not that the detector was shown on simulated signals"
    done
    grep -q 'can sign a forged log' "$tmp/stillmark.1" || echo "stillmark.1: not that the key's holder can forge"
    grep -q 'there is nothing to detect' "$tmp/stillmark.1" || echo "stillmark.1: not what cannot be detected"
    grep -q 'not authentication' "$tmp/stillmark.1" || echo "stillmark.1: not what names are"
} >"$tmp/out"
report "the pages say what Stillmark is not for and cannot do"
exit $failed
