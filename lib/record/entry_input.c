/* SPDX-License-Identifier: GPL-3.0-or-later */
/* entry_input.c: what came in, as entries. Times are ns, or µs where the key says so.
 *
 *   bytes  b         raw bytes as they came
 *          bad       offsets of bytes with a parity or framing error (a break: \u0000 listed here)
 *   act    act       its name
 *          id, seen, who, door, peer {uid}, why
 *          text      note, name, analyst …: what was typed; sheet: the sheet's text
 *          temperature  °C
 *          of        n of the entry it is about
 *          file      sheet: its name as handed over
 *          refused   sheet: why its text was refused
 *   tick
 *   link   state, why, port, device, identity, settings, continues
 *   clock  what, by_us
 *   sent   of        n of the ask
 *   roll
 *
 * What is not stated is left out; `continues` stands only where true. */
#include "record/entry.h"
#include "record/json.h"

static void write_bytes(struct sm_text *t, const struct sm_chunk *c)
{
    sm_json_bytes(t, "b", c->bytes, c->n);
    if (c->n_bad == 0)
        return;
    sm_json_list(t, "bad");
    for (size_t i = 0; i < c->n_bad; i++)
        sm_json_size(t, NULL, c->bad[i]);
    sm_json_close_list(t);
}

static void write_act(struct sm_text *t, const struct sm_act *a)
{
    const bool sheet = a->act == SM_ACT_SHEET;

    sm_json_text(t, "act", sm_act_name(a->act));
    sm_json_words(t, "id", a->id);
    if (a->has_seen)
        sm_json_int(t, "seen", a->seen);
    sm_json_words(t, "who", a->who);
    sm_json_words(t, "door", a->door);
    if (a->has_uid) {
        sm_json_object(t, "peer");
        sm_json_int(t, "uid", a->uid);
        sm_json_close_object(t);
    }
    sm_json_words(t, "why", a->why);
    if (a->has_temperature)
        sm_json_real(t, "temperature", a->temperature_c);
    if (a->has_subject)
        sm_json_int(t, "of", a->subject);
    if (!sheet) {
        sm_json_words(t, "text", a->text);
        return;
    }
    sm_json_words(t, "file", a->sheet_file);
    sm_json_words(t, "refused", a->sheet_why);
    if (a->sheet_text != NULL)
        sm_json_textn(t, "text", a->sheet_text, a->sheet_text_n);
}

static void write_link(struct sm_text *t, const struct sm_link *l)
{
    sm_json_text(t, "state", sm_link_state_name(l->state));
    sm_json_words(t, "why", l->why);
    sm_json_words(t, "port", l->port);
    sm_json_words(t, "device", l->device);
    sm_json_words(t, "identity", l->identity);
    sm_json_words(t, "settings", l->settings);
    if (l->continues)
        sm_json_bool(t, "continues", true);
}

void sm_entry_input(struct sm_text *t, const struct sm_input *in)
{
    sm_json_head(t, in->n, in->t_ns, in->utc_us, sm_input_kind_name(in->kind));
    switch (in->kind) {
    case SM_INPUT_BYTES:
        write_bytes(t, &in->chunk);
        break;
    case SM_INPUT_ACT:
        write_act(t, &in->act);
        break;
    case SM_INPUT_LINK:
        write_link(t, &in->link);
        break;
    case SM_INPUT_CLOCK:
        sm_json_text(t, "what", sm_clock_what_name(in->clock_what));
        sm_json_int(t, "by_us", in->clock_by_us);
        break;
    case SM_INPUT_SENT:
        sm_json_int(t, "of", in->sent_of);
        break;
    case SM_INPUT_TICK:
    case SM_INPUT_ROLL:
    case SM_INPUT_COUNT:
        break;
    }
    sm_json_end(t);
}
