#!/bin/sh
# SPDX-License-Identifier: GPL-3.0-or-later
# lint_proof.sh: shows that each check of lint.sh can fail. It builds a small sound tree in a scratch
# folder, where all must be ok, then breaks it in every way and wants each finding with its place.
#
#     sh tests/lint_proof.sh
set -u
top=$(cd "$(dirname "$0")/.." && pwd) || exit 2
scratch=$(mktemp -d) || exit 2
trap 'rm -rf "$scratch"' EXIT
trap 'exit 2' HUP INT TERM
tree=$scratch/tree
build=$scratch/build
licence='/* SPDX-License-Identifier: GPL-3.0-or-later */'
wrong=0

# Compiles every room of the scratch tree as CMake would.
build_rooms()
{
    rm -rf "$build"
    mkdir -p "$build/lib"
    for room in base reading signal standard curve bench core; do
        for file in "$tree/lib/$room"/*.c; do
            (cd "$build" && cc -std=c11 -O1 -I"$tree/lib" -c "$file" -o "${file##*/}.o") || exit 2
        done
        (cd "$build" && ar rc "lib/libsm_$room.a" ./*.c.o && rm ./*.c.o) || exit 2
    done
    {
        echo '['
        first=1
        for file in "$tree"/lib/*/*.c; do
            [ $first = 1 ] || echo ','
            first=0
            printf '{ "directory": "%s",\n"command": "cc -std=c11 -I%s -c %s",\n"file": "%s" }\n' \
                "$build" "$tree/lib" "$file" "$file"
        done
        echo ']'
    } >"$build/compile_commands.json"
}

lint()
{
    sh "$tree/tests/lint.sh" "$build" "$@" >"$scratch/said" 2>&1
    echo $? >"$scratch/code"
}

# expect_code N: how the last run must have ended.
expect_code()
{
    [ "$(cat "$scratch/code")" = "$1" ] && return
    echo "FAILED lint ended with $(cat "$scratch/code"), want $1:"
    cat "$scratch/said"
    wrong=1
}

# expect TEXT: a line that begins with FAILED and holds it.
expect()
{
    if grep '^FAILED' "$scratch/said" | grep -qF -- "$1"; then
        echo "ok finds: $1"
    else
        echo "FAILED to find: $1"
        wrong=1
    fi
}

mkdir -p "$tree/tests/sim" "$tree/daemon"
cp "$top/tests/lint.sh" "$top/tests/pure-symbols.txt" "$tree/tests/"
cp "$top/.clang-format" "$top/.clang-tidy" "$tree/"
sed '/^[^#]/d' "$top/tests/long-files.txt" >"$tree/tests/long-files.txt"
echo '# SPDX-License-Identifier: GPL-3.0-or-later' >"$tree/CMakeLists.txt"
for room in base reading signal standard curve bench core record setup view; do
    mkdir -p "$tree/lib/$room"
    printf '%s\nint sm_%s(void);\n' "$licence" $room >"$tree/lib/$room/$room.h"
    printf '%s\n#include "%s/%s.h"\n\nint sm_%s(void)\n{\n    return 0;\n}\n' \
        "$licence" $room $room $room >"$tree/lib/$room/$room.c"
done
build_rooms
lint
expect_code 0
[ "$(grep -c '^ok' "$scratch/said")" = "$(grep -c '' "$scratch/said")" ] || { cat "$scratch/said"; wrong=1; }
lint tidy
expect_code 0
grep -q '^ok clang-tidy' "$scratch/said" || wrong=1

# breaks: every one at a place that the finding must name
cd "$tree/lib" || exit 2
printf '%s\n#include "core/core.h"\n#include "daemon/door.h"\n#include "../core/core.h"\n' "$licence" >base/up.h
printf '%s\n#include <jansson.h>\n#include <event2/event.h>\n#include <openssl/sha.h>\n#include "yaml.h"\n' \
    "$licence" >core/out.h
mkdir -p spare
printf '%s\n#include "base/base.h"\n' "$licence" >spare/spare.h
printf '%s\n#include "signal/signal.h"\n' "$licence" >../tests/sim/sim.h
cat >core/clock.c <<EOF
$licence
#include "core/core.h"
#include <stdio.h>
#include <stdlib.h>
#include <time.h>

static long last;
static long step = 5;

int sm_core(void);
long sm_core_clock(char **ret_env)
{
    last += step++ + (long)time(NULL);
    *ret_env = getenv("HOME");
    puts("now");
    return last;
}
EOF
cat >curve/gslio.c <<EOF
$licence
int gsl_vector_fprintf(void *stream);
void gsl_set_error_handler_off(void);
int sm_curve_out(void *stream);
int sm_curve_out(void *stream)
{
    gsl_set_error_handler_off();
    return gsl_vector_fprintf(stream);
}
EOF
printf '%s\nlong double sm_wide;\nint sm_locale(void) { return setlocale(1, ""); }\n' "$licence" >reading/wide.h
printf 'int sm_bare;\n' >view/bare.h
printf '#!/bin/sh\necho\n' >../tests/bare.sh
: >view/empty.c
printf '%s\nint    sm_ugly ;\n' "$licence" >view/ugly.h
{ echo "$licence"; yes 'extern int sm_x;' | head -n 500; } >view/long.h
echo 'lib/view/view.h' >>../tests/long-files.txt
printf '%s\n// TO''DO: later\n' "$licence" >../daemon/later.h
cat >view/bug.c <<EOF
$licence
#include <string.h>
#include <stdlib.h>

int sm_bug(int n);
int sm_bug(int n)
{
    int list[3] = { 1, 2, 3 };
    char *p = malloc(10);

    if (n > 0)
        return list[3];
    if (n < 0);
    memset(p, 0, 10);
    return strcmp(p, "x");
}
EOF
cd "$top" || exit 2
build_rooms
rm "$build/lib/libsm_bench.a"
lint
expect_code 1
expect 'lib/base/up.h:2 room base includes "core/core.h"'
expect 'lib/base/up.h:3 room base includes "daemon/door.h"'
expect 'lib/base/up.h:4 includes "../core/core.h"'
expect 'lib/core/out.h:2 room core includes <jansson.h>'
expect 'lib/core/out.h:3 room core includes <event2/event.h>'
expect 'lib/core/out.h:4 room core includes <openssl/sha.h>'
expect 'lib/core/out.h:5 room core includes <yaml.h>'
expect 'lib/spare/spare.h:2 lies in lib/spare'
expect 'tests/sim/sim.h:2 the simulator includes "signal/signal.h"'
expect 'lib/core/clock.c calls time'
expect 'lib/core/clock.c calls getenv'
expect 'lib/core/clock.c calls puts'
expect 'lib/curve/gslio.c calls gsl_vector_fprintf'
expect 'lib/curve/gslio.c calls gsl_set_error_handler_off'
expect 'lib/bench: libsm_bench.a is not built'
expect 'lib/core/clock.c has a variable in .bss'
expect 'lib/core/clock.c has a variable in .data'
expect 'lib/reading/wide.h:2 long double'
expect 'lib/reading/wide.h:3 int sm_locale'
expect 'lib/view/bare.h:1 has no SPDX line'
expect 'tests/bare.sh:2 has no SPDX line'
expect 'lib/view/empty.c:1 has no SPDX line'
expect 'lib/view/ugly.h:2 differs'
expect 'lib/view/long.h:501 has 501 lines'
expect 'tests/long-files.txt:3 lib/view/view.h is listed without a reason'
expect 'lib/view/view.h is listed, yet not longer than 500 lines'
expect 'daemon/later.h:2'
expect 'lib/view/bug.c:12 arrayIndexOutOfBounds'
lint tidy
expect_code 1
expect 'clang-tidy: lib/view/bug.c:12 '
expect 'lib/view/bug.c:13 potentially unintended semicolon'
exit $wrong
