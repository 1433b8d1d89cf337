/* SPDX-License-Identifier: GPL-3.0-or-later */
/* test_sim_scenario.c: what a scenario's text means, what is blamed in it, and the lines of the
 * shapes.
 */
#include "check.h"
#include "sim/prng.h"
#include "sim/random_session.h"
#include "sim/scenario.h"

#include <stdio.h>
#include <string.h>

#define BLAMES 8

static enum sm_status read_text(const char *text, struct sm_scenario *sc, struct sm_blame *list,
                                struct sm_blames *blames)
{
    sm_blames_init(blames, list, BLAMES);
    sm_scenario_init(sc);
    return sm_scenario_read(sc, "x.scn", text, strlen(text), blames);
}

static void a_full_scenario_is_read_as_written(void **state)
{
    static const char text[] = "# invented\n"
                               "seed 7\r\n"
                               "rate 10 /s\n"
                               "noise 0.05 mV ar 0.5\n"
                               "step 0.1 mV\n"
                               "response double 0.5 s 20 s -10 %\n"
                               "drift 3.6 mV/h\n"
                               "electrode pH slope 98.6 % offset 3.9 mV # at pH 7\n"
                               "shape \"%.2v mV\\r\\x0a\"\n"
                               "\n"
                               "in \"tank a\" 7.95 pH for 1.5 min at 10.8 °C falling 0.006 pH/min\n"
                               "air 800 ms word \"----\"\n"
                               "stray 2 by -40 mV\n"
                               "noise 0.1 mV\n";
    struct sm_scenario sc;
    struct sm_blame list[BLAMES];
    struct sm_blames b;

    (void)state;
    if (read_text(text, &sc, list, &b) != SM_OK)
        fail_msg("blamed: line %u: %s", list[0].line, list[0].text);
    assert_int_equal(sc.seed, 7);
    check_close("rate", sc.rate_per_s, 10, 0);
    assert_int_equal(sc.noise.kind, SM_SIM_NOISE_AR);
    assert_int_equal(sc.response.kind, SM_SIM_RESPONSE_DOUBLE);
    check_close("slow share", sc.response.share, -0.1, 1e-15);
    check_close("drift", sc.drift_per_s, 0.001, 1e-15);
    check_close("rinse water unless told", sc.rinse_value, 6.5, 0);
    assert_string_equal(sc.shape.line.bytes, "%.2v mV\r\n");
    assert_int_equal(sc.n_steps, 4);
    assert_int_equal(sc.step[0].kind, SM_SIM_STEP_IN);
    assert_string_equal(sc.step[0].name, "tank a");
    check_close("span", sc.step[0].span_s, 90, 1e-12);
    check_close("its temperature", sc.step[0].celsius, 10.8, 0);
    check_close("its own change", sc.step[0].per_s, -0.0001, 1e-15);
    check_close("air", sc.step[1].span_s, 0.8, 1e-12);
    assert_string_equal(sc.step[1].open.word, "----");
    check_close("stray", sc.step[2].amount, -40, 0);
    assert_int_equal(sc.step[3].kind, SM_SIM_STEP_NOISE);
    sm_scenario_free(&sc);
}

static void every_mistake_is_blamed_at_its_place(void **state)
{
    static const struct {
        const char *text;
        unsigned line, column;
        const char *part;
    } cases[] = {
        { "", 0, 0, "at least one step" },
        { "# nothing\n", 0, 0, "at least one step" },
        { "seed 7\nspeed 3\nair 1 s\n", 2, 1, "a setting or a step, got \"speed\"" },
        { "seed 7\nseed 8\nair 1 s\n", 2, 1, "each setting once" },
        { "air 1 s\nrate 2 /s\n", 2, 1, "settings come before the first step" },
        { "rate 10\nair 1 s\n", 1, 8, "\"/s\", got the end of the line" },
        { "rate ten /s\nair 1 s\n", 1, 6, "readings, a number from" },
        { "rate 0 /s\nair 1 s\n", 1, 6, "readings, a number from" },
        { "noise 0.1 pH\nair 1 s\n", 1, 11, "expected mV, got \"pH\"" },
        { "noise -0.1 mV\nair 1 s\n", 1, 7, "not negative" },
        { "noise 0.1 mV pink\nair 1 s\n", 1, 14, "\"white\", got \"pink\"" },
        { "tolerance 0 mV\nair 1 s\n", 1, 11, "over 0" },
        { "in a 7.00 pH for 5 s\n", 1, 6, "a value that the electrode feels" },
        { "in a 7.00 mV 5 s\n", 1, 14, "\"for\"" },
        { "in a 7.00 mV for 0 s\n", 1, 18, "how long from 0.001 s" },
        { "in a 7.00 mV for 5 mV\n", 1, 20, "expected s, got \"mV\"" },
        { "in a nan mV for 5 s\n", 1, 6, "a number from" },
        { "in a 1e400 mV for 5 s\n", 1, 6, "a number from" },
        { "in a 7.00 mV for 5 s as boss\n", 1, 25, "sample, standard, check" },
        { "in \"\" 7.00 mV for 5 s\n", 1, 4, "the name" },
        { "in \" a\" 7.00 mV for 5 s\n", 1, 4, "a name of 1 to 64" },
        { "in \"a 7.00 mV for 5 s\n", 1, 4, "closing quote" },
        { "in \"a\"b 7.00 mV for 5 s\n", 1, 7, "a blank after the closing quote" },
        { "in \"a\\q\" 7.00 mV for 5 s\n", 1, 6, "expected \\r" },
        { "back 5 s\n", 1, 1, "an \"in\" before the first \"back\"" },
        { "air 1 s wander 3 mV more\n", 1, 21, "the end of the line" },
        { "stray 0\n", 1, 7, "a whole number from 1" },
        { "stray 1.5\n", 1, 7, "a whole number from 1" },
        { "rubbish 99999999999999999999\n", 1, 9, "a whole number" },
        { "shape no-such\nair 1 s\n", 1, 7, "plain-mv, r-mv" },
        { "shape \"%q\"\nair 1 s\n", 1, 7, "expected one of v a e m" },
        { "shape \"mV\"\nair 1 s\n", 1, 7, "a value in the line (%v" },
        { "shape \"%99v\"\nair 1 s\n", 1, 7, "a width of at most 20" },
        { "rate 2 /s\nsignal pH\nair 1 s\n", 2, 1, "before all settings" },
        { "ask \"R\"\nshape plain-mv\nair 1 s\n", 2, 1, "the shape before" },
        { "signal pH\nelectrode pH slope 99 % offset 0 pH\nair 1 s\n", 2, 14, "a signal in mV" },
        { "electrode log slope 99 % offset 0 mV\nrinse-water 0 mg/L\nair 1 s\n", 2, 13, "over 0" },
        { "drift 5 mV\nair 1 s\n", 1, 9, "a unit per time" },
        { "a a a a a a a a a a a a a a a a a a a a a a a a a\n", 1, 49, "too many words" },
    };

    (void)state;
    for (size_t i = 0; i < COUNT(cases); i++) {
        struct sm_scenario sc;
        struct sm_blame list[BLAMES];
        struct sm_blames b;
        const enum sm_status got = read_text(cases[i].text, &sc, list, &b);
        if (got != SM_ESYNTAX)
            fail_msg("case %zu, %s: status %d, want a syntax error", i, cases[i].text, got);
        if (list[0].line != cases[i].line || list[0].column != cases[i].column ||
            !strstr(list[0].text, cases[i].part))
            fail_msg("case %zu, %s: got %u:%u: %s, want %u:%u: …%s…", i, cases[i].text,
                     list[0].line, list[0].column, list[0].text, cases[i].line, cases[i].column,
                     cases[i].part);
        sm_scenario_free(&sc);
    }
}

static void all_mistakes_come_at_once(void **state)
{
    struct sm_scenario sc;
    struct sm_blame list[BLAMES];
    struct sm_blames b;

    (void)state;
    assert_int_equal(read_text("speed 1\nrate x /s\nair 1 s\nlift 2\n", &sc, list, &b), SM_ESYNTAX);
    assert_int_equal(b.n, 3);
    assert_int_equal(list[0].line, 1);
    assert_int_equal(list[1].line, 2);
    assert_int_equal(list[2].line, 4);
    sm_scenario_free(&sc);
}

static void any_text_is_read_or_blamed(void **state)
{
    static const char good[] =
        "signal mV\nrate 10 /s\nresponse double 1 s 2 s 5 %\nopen word \"----\"\n"
        "shape \"%+07.1v mV*%X\\r\\n\"\nin a 1 mV for 2 s rising 1 mV/h\n"
        "say \"\\x00\" times 3\nrubbish 9 printable\n";
    struct sm_sim_prng p;

    (void)state;
    sm_sim_prng_init(&p, 5, 0);
    for (int round = 0; round < 20000; round++) {
        char text[sizeof good];
        struct sm_scenario sc;
        struct sm_blame list[BLAMES];
        struct sm_blames b;
        memcpy(text, good, sizeof good);
        for (unsigned changes = 1 + sm_sim_prng_below(&p, 4); changes > 0; changes--)
            text[sm_sim_prng_below(&p, sizeof good - 1)] =
                (char)(1 + (int)sm_sim_prng_below(&p, 126));
        sm_blames_init(&b, list, BLAMES);
        sm_scenario_init(&sc);
        const enum sm_status got = sm_scenario_read(&sc, "x.scn", text, sizeof good - 1, &b);
        if ((got == SM_OK) != (b.n == 0))
            fail_msg("round %d: status %d with %zu blames:\n%s", round, got, b.n, text);
        sm_scenario_free(&sc);
    }
}

static void shapes_write_what_the_profiles_give_as_examples(void **state)
{
    /* The lines are the `example` of conf/profiles/NAME.yaml; an exponent has two digits here. */
    static const struct {
        const char *shape;
        struct sm_sim_shown shown;
        const char *want;
    } cases[] = {
        { "plain-mv", { -12.4, NULL, 24.8, 1 }, "-0012.4 mV  24.8 C\r\n" },
        { "plain-mv", { 12.4, NULL, 24.8, 1 }, "+0012.4 mV  24.8 C\r\n" },
        { "plain-mv", { 12.4, "open", 24.8, 1 }, "   open mV  24.8 C\r\n" },
        { "r-mv", { -12.4, NULL, 24.8, 1 }, "-0012.4 mV  24.8 C\r\n" },
        { "semi-comma", { 1412.6, NULL, 24.8, 17 }, "0017;1412,6;uS/cm;24,8;°C;st\n" },
        { "semi-comma", { 1412.6, "wt", 24.8, 17 }, "0017;1412,6;uS/cm;24,8;°C;wt\n" },
        { "star-sum", { 0.4312, NULL, 23.9, 1 }, "a=0.4312 A t=23.9 C q=ok*53\r" },
        { "scpi-volt", { -12.345, NULL, 20, 1 }, "-1.23450000E-02\n" },
    };

    (void)state;
    for (size_t i = 0; i < COUNT(cases); i++) {
        struct sm_sim_shape shape;
        char got[SM_SIM_SHAPE_LINE];
        if (!sm_sim_shape_known(cases[i].shape, &shape) || sm_sim_shape_wrong(&shape.line))
            fail_msg("shape %s is not known or not sound", cases[i].shape);
        const size_t n = sm_sim_shape_write(&shape, &cases[i].shown, got);
        if (strcmp(got, cases[i].want) != 0 || n != strlen(cases[i].want))
            fail_msg("%s: got \"%s\", want \"%s\"", cases[i].shape, got, cases[i].want);
    }
}

static void sign_set_apart_exponent_and_checksum_stand_where_told(void **state)
{
    struct sm_sim_shape shape;
    char got[SM_SIM_SHAPE_LINE], want[SM_SIM_SHAPE_LINE];
    const struct sm_sim_shown below = { -12.345, NULL, 24.8, 1 }, above = { 12.345, "S3", 24.8, 1 };

    (void)state;
    assert_true(sm_sim_shape_known("pause-hex", &shape));
    sm_sim_shape_write(&shape, &below, got);
    if (strncmp(got, "S0 - 1.2345E-02 V 24.8#", 23) != 0 || strlen(got) != 27)
        fail_msg("below 0: got \"%s\"", got);
    sm_sim_shape_write(&shape, &above, got);
    if (strncmp(got, "S3 1.2345E-02 V 24.8#", 21) != 0)
        fail_msg("above 0, a status word: got \"%s\"", got);
    /* Check value of CRC-16/MODBUS over "123456789": 4B37 (public CRC catalogue). */
    shape.line = (struct sm_sim_shape_text){ "123456789%-M", 12 };
    sm_sim_shape_write(&shape, &below, got);
    assert_string_equal(got, "1234567894B37");
    /* By hand: '1' ^ '2' = 03; 0x31 + 0x32 = 63. */
    shape.line = (struct sm_sim_shape_text){ "12*%X", 5 };
    sm_sim_shape_write(&shape, &below, got);
    assert_string_equal(got, "12*03");
    shape.line = (struct sm_sim_shape_text){ "12*%S", 5 };
    sm_sim_shape_write(&shape, &below, got);
    assert_string_equal(got, "12*63");
    /* The longest line there can be stays in its storage. */
    shape.line =
        (struct sm_sim_shape_text){ "%20.9v%20.9v%20.9v%20.9v%20.9v%20.9v%20.9v%20.9v", 48 };
    assert_null(sm_sim_shape_wrong(&shape.line));
    const struct sm_sim_shown huge = { -1e300, NULL, 1e300, 1 };
    const size_t n = sm_sim_shape_write(&shape, &huge, want);
    assert_int_equal(strlen(want), n);
    assert_true(n < SM_SIM_SHAPE_LINE);
}

static void a_random_session_keeps_its_promises(void **state)
{
    struct sm_random_session r;
    struct sm_scenario sc;
    double last = 0;
    unsigned beakers = 0;

    (void)state;
    sm_random_session_init(&r, 1000, 11);
    sm_scenario_init(&sc);
    assert_int_equal(sm_random_session_make(&r, &sc), SM_OK);
    for (size_t i = 0; i < sc.n_steps; i++) {
        const struct sm_sim_step *s = &sc.step[i];
        if (s->kind == SM_SIM_STEP_AIR && !(s->span_s >= r.air_shortest_s))
            fail_msg("step %zu: %g s in air", i, s->span_s);
        if (s->kind == SM_SIM_STEP_RINSE && !(s->span_s < r.dwell_s))
            fail_msg("step %zu: a rinse of %g s is no shorter than the dwell", i, s->span_s);
        if (s->kind != SM_SIM_STEP_IN)
            continue;
        const double step = s->value > last ? s->value - last : last - s->value;
        if (sc.step[i - 1].kind != SM_SIM_STEP_AIR)
            fail_msg("beaker %u is opened by no transit", beakers + 1);
        if (!(step >= r.step_from * (1 - 1e-9) && step <= r.step_to * (1 + 1e-9)))
            fail_msg("beaker %u: a step of %g mV", beakers + 1, step);
        last = s->value;
        beakers++;
    }
    assert_int_equal(beakers, 1000);
    sm_scenario_free(&sc);
    r.step_to = r.step_from / 2;
    assert_int_equal(sm_random_session_make(&r, &sc), SM_EINVAL);
    sm_scenario_free(&sc);
}

int main(void)
{
    static const struct CMUnitTest tests[] = {
        cmocka_unit_test(a_full_scenario_is_read_as_written),
        cmocka_unit_test(every_mistake_is_blamed_at_its_place),
        cmocka_unit_test(all_mistakes_come_at_once),
        cmocka_unit_test(any_text_is_read_or_blamed),
        cmocka_unit_test(shapes_write_what_the_profiles_give_as_examples),
        cmocka_unit_test(sign_set_apart_exponent_and_checksum_stand_where_told),
        cmocka_unit_test(a_random_session_keeps_its_promises),
    };
    return cmocka_run_group_tests(tests, NULL, NULL);
}
