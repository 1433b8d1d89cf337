/* SPDX-License-Identifier: GPL-3.0-or-later */
/* fits.c: a method against the channels of a profile. */
#include "bench/fits.h"

static void add_channels(struct sm_text *t, const struct sm_profile *p)
{
    for (size_t i = 0; i < p->n_channels; i++)
        sm_text_addf(t, "%s%s", i > 0 ? ", " : "", p->channel[i].name);
}

/* The channel of this name; -1: said why. */
static int find_channel(const struct sm_profile *p, const struct sm_method *m, const char *key,
                        const char *name, struct sm_text *why)
{
    const int i = sm_profile_channel(p, name);

    if (i < 0) {
        sm_text_addf(why, "%s of method %s: profile %s has no channel \"%s\"; it has ", key,
                     m->name, p->name, name);
        add_channels(why, p);
    }
    return i;
}

static bool signal_fits(const struct sm_method *m, const struct sm_profile *p, struct sm_text *why)
{
    const int i = find_channel(p, m, "signal", m->signal, why);

    if (i < 0)
        return false;
    if (p->channel[i].unit != m->signal_unit) {
        sm_text_addf(why, "method %s wants a signal in %s, and %s of profile %s is in %s", m->name,
                     sm_unit_name(m->signal_unit), m->signal, p->name,
                     p->channel[i].unit == SM_UNIT_NONE ? "no unit"
                                                        : sm_unit_name(p->channel[i].unit));
        return false;
    }
    if (!p->channel[i].raw && m->model != SM_MODEL_AS_READ) {
        sm_text_addf(
            why,
            "%s of profile %s is calibrated in the meter (is: calibrated): a curve needs a "
            "raw signal",
            m->signal, p->name);
        return false;
    }
    return true;
}

enum sm_status sm_method_fits(const struct sm_method *method, const struct sm_profile *profile,
                              char ret_why[SM_REASON_SIZE])
{
    struct sm_text why;
    int i;

    sm_text_init(&why, ret_why, SM_REASON_SIZE);
    if (!signal_fits(method, profile, &why))
        return SM_EINVAL;
    if (method->temperature_from != SM_TEMPERATURE_CHANNEL)
        return SM_OK;
    i = find_channel(profile, method, "temperature", method->temperature, &why);
    if (i < 0)
        return SM_EINVAL;
    if (profile->channel[i].unit != SM_UNIT_CELSIUS) {
        sm_text_addf(&why, "temperature of method %s: %s of profile %s is not in °C", method->name,
                     method->temperature, profile->name);
        return SM_EINVAL;
    }
    return SM_OK;
}
