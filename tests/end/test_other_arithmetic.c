/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The same log on another variant of the mathematical library: glibc picks exp, log and others by
 * processor, and GLIBC_TUNABLES takes features of the processor away. Replay must then compare by
 * tolerance, and say so. */
#include "log_maker.h"

#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <sys/wait.h>
#include <unistd.h>

#include "record/arithmetic.h"
#include "sim/sim.h"

#define UTC_US INT64_C(1796112000000000)

/* Spellings of the same wish; which one a glibc understands depends on its version. */
static const char *const spellings[] = {
    "glibc.cpu.hwcaps=-FMA,-AVX2",
    "glibc.cpu.hwcaps=-FMA_Usable,-AVX2_Usable",
    "glibc.cpu.hwcaps=-FMA_Usable,-AVX2_Usable,-FMA4_Usable",
    "glibc.cpu.hwcaps=-AVX2_Usable,-FMA_Usable",
};

static char self[4096]; /* this program */
static char log_file[] = "/tmp/stillmark-arithmetic.XXXXXX";

/* What a command says, with its exit status. */
static int run(const char *command, char *out, size_t cap)
{
    FILE *p = popen(command, "r");
    size_t n;

    assert_non_null(p);
    n = fread(out, 1, cap - 1, p);
    out[n] = '\0';
    return WEXITSTATUS(pclose(p));
}

/* The first spelling under which this machine's arithmetic is another one; NULL: none. */
static const char *other_variant(void)
{
    char here[17], command[4400], out[64];

    sm_arithmetic(here);
    for (size_t i = 0; i < COUNT(spellings); i++) {
        snprintf(command, sizeof command, "GLIBC_TUNABLES=%s '%s' hash", spellings[i], self);
        assert_int_equal(run(command, out, sizeof out), 0);
        assert_int_equal(strcspn(out, "\n"), 16);
        if (strncmp(out, here, 16) != 0)
            return spellings[i];
    }
    return NULL;
}

static int make_log(void **state)
{
    struct log_maker m;
    struct sm_scenario sc;
    struct sm_sim *sim;
    struct sm_blame list[1];
    struct sm_blames b;
    size_t n, sheet_n;
    char *text = check_read_file("tests/sim/scenarios/try.scn", &n);
    char *sheet = check_read_file("conf/sheets/try.yaml", &sheet_n);
    const int fd = mkstemp(log_file);

    (void)state;
    assert_true(fd >= 0);
    sm_blames_init(&b, list, 1);
    sm_scenario_init(&sc);
    assert_int_equal(sm_scenario_read(&sc, "try.scn", text, n, &b), SM_OK);
    assert_int_equal(sm_sim_create(&sc, &sim), SM_OK);
    log_maker_begin(&m, "conf/try.yaml", "try", UTC_US);
    log_maker_sheet(&m, "sheets/try.yaml", sheet, sheet_n);
    log_maker_play(&m, sim, SM_NEVER);
    log_maker_end(&m);
    assert_int_equal(write(fd, m.file[0].text, m.file[0].n), m.file[0].n);
    close(fd);
    log_maker_finish(&m);
    sm_sim_destroy(sim);
    sm_scenario_free(&sc);
    free(text);
    free(sheet);
    return 0;
}

static int remove_log(void **state)
{
    (void)state;
    return unlink(log_file);
}

static void on_the_same_arithmetic_replay_compares_bytes(void **state)
{
    char command[4400], out[4096];

    (void)state;
    snprintf(command, sizeof command, "'%s/stillmark-replay' '%s' 2>&1", SM_BIN_DIR, log_file);
    if (run(command, out, sizeof out) != 0 || strstr(out, "byte for byte") == NULL)
        fail_msg("%s says: %s", command, out);
}

static void on_another_arithmetic_replay_compares_by_tolerance_and_says_so(void **state)
{
    const char *variant = other_variant();
    char command[4600], out[4096];

    (void)state;
    if (variant == NULL) {
        print_message("  no spelling changes this machine's arithmetic: compared byte for byte "
                      "instead\n");
        variant = spellings[0];
    } else {
        print_message("  GLIBC_TUNABLES=%s changes this machine's arithmetic\n", variant);
    }
    snprintf(command, sizeof command, "GLIBC_TUNABLES=%s '%s/stillmark-replay' '%s' 2>&1", variant,
             SM_BIN_DIR, log_file);
    if (run(command, out, sizeof out) != 0)
        fail_msg("%s says: %s", command, out);
    if (other_variant() == NULL) {
        if (strstr(out, "byte for byte") == NULL)
            fail_msg("%s says: %s", command, out);
        return;
    }
    if (strstr(out, "arithmetic is another one") == NULL ||
        strstr(out, "within tolerance") == NULL || strstr(out, "byte for byte") != NULL)
        fail_msg("%s says: %s", command, out);
}

int main(int argc, char **argv)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(on_the_same_arithmetic_replay_compares_bytes),
        cmocka_unit_test(on_another_arithmetic_replay_compares_by_tolerance_and_says_so),
    };
    const ssize_t n = readlink("/proc/self/exe", self, sizeof self - 1);

    if (argc > 1 && strcmp(argv[1], "hash") == 0) { /* this program under another library variant */
        char hex[17];

        sm_arithmetic(hex);
        return puts(hex) < 0;
    }
    if (n <= 0)
        return 1;
    self[n] = '\0';
    return cmocka_run_group_tests(tests, make_log, remove_log);
}
