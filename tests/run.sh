#!/bin/sh
# SPDX-License-Identifier: GPL-3.0-or-later
# Installs what is needed, builds, and runs the tests: gcc, clang, sanitizers, valgrind, lint, the main job
# end to end. `--deps`: only install packages. Ends with "N passed, N failed".
set -u
cd "$(dirname "$0")/.." || exit 2
sh daemon/try.sh --deps || exit 2

packages="clang libclang-rt-14-dev clang-format clang-tidy cppcheck valgrind openssl tmux procps man-db groff systemd strace"
missing=
for p in $packages; do
    dpkg-query -W -f '${Status}' "$p" 2>/dev/null | grep -q 'ok installed' || missing="$missing $p"
done
if [ -n "$missing" ]; then
    echo "Installing Debian packages:$missing"
    as_root=
    [ "$(id -u)" = 0 ] || as_root=sudo
    DEBIAN_FRONTEND=noninteractive $as_root apt-get install -y -qq $missing >/dev/null || exit 2
fi
[ "${1:-}" = --deps ] && exit 0

passed=0
failed=0
mkdir -p build
count() { # what, passed, failed
    printf '%s: %s passed, %s failed.\n' "$1" "$2" "$3"
    passed=$((passed + $2))
    failed=$((failed + $3))
}

# Builds a folder and runs its tests; $1 what, $2 folder, $3 ctest's choice; the rest for cmake.
suite() {
    what=$1 dir=$2 choice=$3
    shift 3
    echo "== $what =="
    mkdir -p "$dir"
    if ! { cmake -S . -B "$dir" "$@" && cmake --build "$dir" -j "$(nproc)"; } >"$dir/suite.log" 2>&1; then
        grep -E 'error|Error|undefined' "$dir/suite.log" | head -n 20
        count "$what" 0 1
        return
    fi
    # shellcheck disable=SC2086
    (cd "$dir" && ctest -j "$(nproc)" --output-on-failure $choice) >"$dir/suite-tests.log" 2>&1
    all=$(sed -n 's/.* tests failed out of \([0-9]*\).*/\1/p' "$dir/suite-tests.log")
    bad=$(sed -n 's/.* \([0-9]*\) tests failed out of .*/\1/p' "$dir/suite-tests.log")
    if [ -z "$all" ]; then
        tail -n 20 "$dir/suite-tests.log"
        count "$what" 0 1
        return
    fi
    [ "$bad" = 0 ] || grep -vE '^ *[0-9]+/[0-9]+ .*Passed|^ *Start ' "$dir/suite-tests.log" | head -n 150
    count "$what" $((all - bad)) "$bad"
}

one() { # what, command …
    what=$1
    shift
    if "$@" >build/one.log 2>&1; then
        count "$what" 1 0
    else
        tail -n 40 build/one.log
        count "$what" 0 1
    fi
}

suite "gcc" build "-LE proof"
suite "clang" build/with-clang "-LE long-run|proof" -DCMAKE_C_COMPILER=clang
suite "sanitizers" build/with-sanitizers "-LE long-run|proof" -DCMAKE_C_COMPILER=clang -DSM_SANITIZE=ON -DCMAKE_BUILD_TYPE=Debug

echo "== valgrind =="
for t in test_run test_judge test_core test_signal test_frame test_parse; do
    one "valgrind $t" valgrind -q --error-exitcode=9 --leak-check=full "build/bin/$t"
done

echo "== lint =="
{
    sh tests/lint.sh build
    sh tests/lint.sh build tidy
    sh tests/lint_proof.sh
    sh tests/unit.sh build
    sh tests/manual.sh build
} >build/lint.log 2>&1
grep -v '^ok ' build/lint.log | head -n 60
count lint "$(grep -c '^ok ' build/lint.log)" "$(grep -c '^FAILED ' build/lint.log)"

echo "== the main job, as the README has it =="
one "daemon/try.sh" sh daemon/try.sh

echo
echo "$passed passed, $failed failed"
[ "$failed" = 0 ] && [ "$passed" -gt 0 ]
