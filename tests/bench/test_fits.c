/* SPDX-License-Identifier: GPL-3.0-or-later */
#include <string.h>

#include "bench/fits.h"
#include "check.h"

static const struct sm_profile profile = {
    .name = "p",
    .n_channels = 3,
    .channel = { { .name = "potential", .unit = SM_UNIT_MV, .raw = true },
                 { .name = "probe", .unit = SM_UNIT_CELSIUS },
                 { .name = "ph", .unit = SM_UNIT_PH } },
};

static const struct sm_method sound = { .name = "m",
                                        .measures = SM_UNIT_PH,
                                        .signal = "potential",
                                        .signal_unit = SM_UNIT_MV,
                                        .model = SM_MODEL_NERNST,
                                        .temperature_from = SM_TEMPERATURE_CHANNEL,
                                        .temperature = "probe" };

static void expect(const char *what, const struct sm_method *m, const char *want)
{
    char why[SM_REASON_SIZE] = "";
    const enum sm_status st = sm_method_fits(m, &profile, why);

    if (st != (want[0] == '\0' ? SM_OK : SM_EINVAL) || strcmp(why, want) != 0)
        fail_msg("%s: status %d, got \"%s\", want \"%s\"", what, st, why, want);
}

static void a_method_whose_channels_and_units_are_there_fits(void **state)
{
    struct sm_method m = sound;

    (void)state;
    expect("sound", &m, "");
    m.temperature_from = SM_TEMPERATURE_TYPED;
    strcpy(m.temperature, "");
    expect("temperature typed", &m, "");
}

static void a_method_that_does_not_fit_is_told_why(void **state)
{
    struct sm_method m = sound;

    (void)state;
    strcpy(m.signal, "potentail");
    expect(
        "no such signal", &m,
        "signal of method m: profile p has no channel \"potentail\"; it has potential, probe, ph");
    m = sound;
    m.signal_unit = SM_UNIT_A;
    expect("other unit", &m, "method m wants a signal in A, and potential of profile p is in mV");
    m = sound;
    strcpy(m.signal, "ph");
    m.signal_unit = SM_UNIT_PH;
    expect(
        "calibrated in the meter", &m,
        "ph of profile p is calibrated in the meter (is: calibrated): a curve needs a raw signal");
    m.model = SM_MODEL_AS_READ;
    expect("read as it is", &m, "");
    m = sound;
    strcpy(m.temperature, "bath");
    expect(
        "no such temperature", &m,
        "temperature of method m: profile p has no channel \"bath\"; it has potential, probe, ph");
    strcpy(m.temperature, "ph");
    expect("no temperature", &m, "temperature of method m: ph of profile p is not in °C");
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(a_method_whose_channels_and_units_are_there_fits),
        cmocka_unit_test(a_method_that_does_not_fit_is_told_why),
    };

    return cmocka_run_group_tests(tests, NULL, NULL);
}
