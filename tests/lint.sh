#!/bin/sh
# SPDX-License-Identifier: GPL-3.0-or-later
# lint.sh: what a compiler does not check about this tree.
#
#     sh tests/lint.sh BUILD         everything that is quick (BUILD: a folder where the tree was built)
#     sh tests/lint.sh BUILD tidy    clang-tidy alone, which takes minutes
#
# One line per check, "ok what", or one line per finding, "FAILED what: file:line finding".
# Exit 0 when all are ok, 1 when one failed, 2 when it could not be run.
set -u
LC_ALL=C
export LC_ALL

if [ $# -lt 1 ] || [ ! -d "$1" ] || { [ $# -gt 1 ] && [ "$2" != tidy ]; }; then
    echo "usage: sh tests/lint.sh BUILD [tidy]" >&2
    exit 2
fi
build=$(cd "$1" && pwd) || exit 2
cd "$(dirname "$0")/.." || exit 2
tmp=$(mktemp -d) || exit 2
trap 'rm -rf "$tmp"' EXIT
trap 'exit 2' HUP INT TERM

rooms="base reading signal standard curve bench core record setup view"
pure="base reading signal standard curve bench core"
failed=0

# report NAME: prints what stands in $tmp/out as the findings of one check.
report()
{
    if [ ! -s "$tmp/out" ]; then
        echo "ok $1"
        return
    fi
    failed=1
    sed -n "1,20s|^|FAILED $1: |p" "$tmp/out"
    [ "$(wc -l <"$tmp/out")" -le 20 ] || echo "FAILED $1: and $(($(wc -l <"$tmp/out") - 20)) more"
}

# have NAME TOOL: a check whose tool is missing has failed, for it has shown nothing.
have()
{
    command -v "$2" >/dev/null 2>&1 && return 0
    echo "$2 is not installed" >"$tmp/out"
    report "$1"
    return 1
}

# files DIR… -- PATTERN…: their paths, sorted.
files()
{
    dirs=
    while [ "$1" != -- ]; do
        [ -d "$1" ] && dirs="$dirs $1"
        shift
    done
    shift
    for pattern in "$@"; do
        # shellcheck disable=SC2086
        find $dirs -type f -name "$pattern" -print
    done | sort
}

# A room includes itself and the rooms above it; up to core no room knows JSON, YAML, network or
# cryptography; the simulator knows nothing of how settling is judged.
check_includes()
{
    # shellcheck disable=SC2016
    files lib tests/sim -- '*.[ch]' | xargs awk -v rooms="$rooms" '
        BEGIN {
            n = split(rooms, name, " ")
            for (i = 1; i <= n; i++)
                rank[name[i]] = i
        }
        function finding(what) { printf "%s:%d %s\n", FILENAME, FNR, what }
        !/^[ \t]*#[ \t]*include/ { next }
        {
            split(FILENAME, part, "/")
            room = part[1] == "lib" ? part[2] : ""
            header = $0
            sub(/^[^<"]*[<"]/, "", header)
            sub(/[>"].*/, "", header)
            top = header
            sub(/\/.*/, "", top)
            if (header ~ /\.\./)
                finding("includes \"" header "\": say the room, not the way to it")
            else if (room == "" && top == "signal")
                finding("the simulator includes \"" header "\"")
            if (room == "")
                next
            if (!(room in rank))
                finding("lies in lib/" room ", which is no room")
            else if (top in rank && rank[top] > rank[room])
                finding("room " room " includes \"" header "\" of a room below it")
            else if ($0 ~ /"/ && header ~ /\// && !(top in rank))
                finding("room " room " includes \"" header "\", which is in no room")
            else if (rank[room] <= rank["core"] &&
                     header ~ /^(jansson|yaml|event2|evutil|openssl|libserialport|systemd)/)
                finding("room " room " includes <" header ">")
        }' >"$tmp/out"
    report "room order"
}

# The libraries of the pure rooms, as far as they are built; a finding for each that is not.
pure_libraries()
{
    for room in $pure; do
        if [ -f "$build/lib/libsm_$room.a" ]; then
            echo "$build/lib/libsm_$room.a"
        else
            echo "lib/$room: libsm_$room.a is not built in $build" >>"$tmp/out"
        fi
    done
}

# The pure rooms call nothing that is not on the list. What sanitizers, coverage and fortified headers
# put in is taken off first.
check_symbols()
{
    have "pure calls" nm || return
    : >"$tmp/out"
    pure_libraries >"$tmp/libs"
    while read -r lib; do
        room=${lib##*/libsm_}
        nm -A -u "$lib" 2>>"$tmp/out" | sed "s|^.*[:(]\([^:()]*\)\.c\.o)*:.* \([^ ]*\)\$|lib/${room%.a}/\1.c \2|"
    done <"$tmp/libs" >"$tmp/calls"
    awk '
        FNR == NR {
            if ($0 ~ /^#/ || NF == 0)
                next
            glob = $1
            deny = sub(/^!/, "", glob)
            gsub(/\*/, ".*", glob)
            if (deny)
                forbidden[++nf] = "^" glob "$"
            else
                allowed[++na] = "^" glob "$"
            next
        }
        {
            symbol = $2
            sub(/@.*/, "", symbol)
            if (symbol ~ /^(sm_|__asan_|__ubsan_|__sanitizer_|__gcov_|__llvm_|_GLOBAL_OFFSET_TABLE_)/)
                next
            if (symbol ~ /^__.*_chk$/ && symbol != "__stack_chk_fail") {
                sub(/^__/, "", symbol)
                sub(/_chk$/, "", symbol)
            }
            good = 0
            for (i = 1; i <= na; i++)
                good = good || symbol ~ allowed[i]
            for (i = 1; i <= nf; i++)
                good = good && symbol !~ forbidden[i]
            if (!good)
                print $1 " calls " symbol
        }' tests/pure-symbols.txt "$tmp/calls" | sort -u >>"$tmp/out"
    report "pure calls"
}

# The pure rooms keep nothing between calls: no section for variables. (Tables of pointers are constant
# and lie in .data.rel.ro.) Sanitizers and coverage bring variables of their own.
check_globals()
{
    have "pure memory" objdump || return
    : >"$tmp/out"
    pure_libraries >"$tmp/libs"
    while read -r lib; do
        nm "$lib" 2>/dev/null | grep -q -E ' (__asan_|__gcov_|__llvm_)' && continue
        room=${lib##*/libsm_}
        objdump -h "$lib" | awk -v room="${room%.a}" '
            /file format/ { object = $1; sub(/\.o:$/, "", object) }
            $2 ~ /^\.(data|bss|tdata|tbss)(\.[^r].*)?$/ && $3 !~ /^0+$/ {
                print "lib/" room "/" object " has a variable in " $2
            }'
    done <"$tmp/libs" >>"$tmp/out"
    report "pure memory"
}

# What no room up to core may write, though the compiler would take it.
check_words()
{
    # shellcheck disable=SC2046
    grep -nE '\b(setlocale|long double|_GNU_SOURCE|strto(ld|f)|ato[fil])\b' \
        $(for room in $pure; do echo "lib/$room"; done | while read -r dir; do files "$dir" -- '*.[ch]'; done) \
        /dev/null | grep -vE '^[^:]*:[0-9]+:[ ]*(/?\*|//)' | sed 's/^\([^:]*:[0-9]*\):/\1 /' >"$tmp/out"
    report "pure language"
    files lib daemon tests conf systemd replay-data -- '*.[ch]' '*.sh' '*.py' '*.txt' '*.md' '*.yaml' '*.js' '*.html' '*.css' |
        xargs grep -nE '\b(TO[D]O|FIX[M]E)\b|[Nn]ot implemente[d]' /dev/null |
        sed 's/^\([^:]*:[0-9]*\):/\1 /' >"$tmp/out"
    report "nothing left for later"
}

check_spdx()
{
    { files lib daemon tests conf systemd -- '*.[ch]' '*.sh' '*.py' CMakeLists.txt && echo CMakeLists.txt; } |
        while read -r file; do
            line=1
            [ "$(head -c 2 "$file")" != '#!' ] || line=2
            sed -n ${line}p "$file" | grep -q 'SPDX-License-Identifier: GPL-3\.0-or-later' ||
                echo "$file:$line has no SPDX line"
        done >"$tmp/out"
    report "licence lines"
}

check_format()
{
    have "format" clang-format || return
    files lib daemon tests -- '*.[ch]' | xargs clang-format --dry-run -Werror 2>&1 |
        sed -n 's/^\([^:]*:[0-9]*\):[0-9]*: error: code should be clang-formatted.*/\1 differs/p' |
        awk -F: '!seen[$1]++' >"$tmp/out" # the first place of each file will do
    report "format"
}

check_length()
{
    files lib daemon -- '*.[ch]' | xargs wc -l | awk -v list=tests/long-files.txt '
        BEGIN {
            while ((getline line < list) > 0) {
                at++
                if (line ~ /^#/ || line ~ /^[ \t]*$/)
                    continue
                n = split(line, word, " ")
                listed[word[1]] = at
                if (n < 3)
                    printf "%s:%d %s is listed without a reason\n", list, at, word[1]
            }
        }
        $2 == "total" { next }
        $1 > 500 && !($2 in listed) { printf "%s:501 has %d lines, more than 500\n", $2, $1 }
        $1 > 500 { delete listed[$2] }
        END {
            for (file in listed)
                printf "%s:%d %s is listed, yet not longer than 500 lines\n", list, listed[file], file
        }' >"$tmp/out"
    report "length"
}

check_cppcheck()
{
    have "cppcheck" cppcheck || return
    dirs=
    for dir in lib daemon; do
        [ -n "$(files "$dir" -- '*.c')" ] && dirs="$dirs $dir"
    done
    # shellcheck disable=SC2086
    cppcheck -q -j2 --std=c11 --enable=warning,portability,performance --inline-suppr --error-exitcode=1 \
        -Ilib -I. -DSM_VERSION='""' -DPCRE2_CODE_UNIT_WIDTH=8 \
        --template='{file}:{line} {id}: {message}' $dirs >"$tmp/cppcheck" 2>&1
    code=$?
    grep -E '^[^ ]+:[0-9]+ ' "$tmp/cppcheck" | grep -v ':0 ' >"$tmp/out"
    if [ $code -ne 0 ] && [ ! -s "$tmp/out" ]; then
        echo "cppcheck ended with $code: $(head -1 "$tmp/cppcheck")" >"$tmp/out"
    fi
    report "cppcheck"
}

check_tidy()
{
    have "clang-tidy" clang-tidy || return
    if [ ! -f "$build/compile_commands.json" ]; then
        echo "no compile_commands.json in $build" >"$tmp/out"
        report "clang-tidy"
        return
    fi
    sed -n 's|.*"file": "\(.*\)".*|\1|p' "$build/compile_commands.json" |
        grep -E "^$PWD/(lib|daemon)/" | sort -u >"$tmp/list"
    [ -s "$tmp/list" ] || echo "no file of lib/ in $build/compile_commands.json" >"$tmp/none"
    # One file each: with several, version 14 takes every va_list after the first file for uninitialized.
    # gcc's own flags are no news here; asserts are looked at even where the build leaves them out
    xargs -P2 -n1 clang-tidy -p "$build" --quiet --warnings-as-errors='*' \
        --extra-arg=-Wno-unknown-warning-option --extra-arg=-UNDEBUG \
        <"$tmp/list" >"$tmp/tidy" 2>"$tmp/err"
    code=$?
    { [ ! -f "$tmp/none" ] || cat "$tmp/none"; } >"$tmp/out"
    sed -n -e "s|^$PWD/\([^:]*:[0-9]*\):[0-9]*: error: |\1 |p" -e '/^error: /p' "$tmp/tidy" |
        sed 's/,-warnings-as-errors//' | sort -u >>"$tmp/out"
    if [ $code -ne 0 ] && [ ! -s "$tmp/out" ]; then
        echo "clang-tidy ended with $code: $(grep -v 'warnings generated' "$tmp/err" | head -1)" >"$tmp/out"
    fi
    report "clang-tidy"
}

if [ $# -gt 1 ]; then
    check_tidy
else
    check_includes
    check_symbols
    check_globals
    check_words
    check_spdx
    check_length
    check_format
    check_cppcheck
fi
exit $failed
