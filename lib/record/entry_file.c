/* SPDX-License-Identifier: GPL-3.0-or-later */
/* entry_file.c: the entries that are about the file itself.
 *
 *   open   format, program, core, arithmetic, meter, ordinal
 *          previous {ordinal, stamp, left_out_lines, left_out_bytes}
 *          key, key_note, how, aged (ns), missed, carried {…}
 *   file   name, text, sheet (only where true)
 *   close  why
 *   stamp  from, hash, sig
 *
 * A stamp has exactly these keys and repeats t and utc of the entry before it, so that `verify` can
 * tell a stamp that was changed by a single byte. */
#include "record/entry.h"
#include "record/json.h"

static void write_previous(struct sm_text *t, const struct sm_entry_open *o)
{
    if (!o->previous.has)
        return;
    sm_json_object(t, "previous");
    sm_json_int(t, "ordinal", o->previous.ordinal);
    sm_json_words(t, "stamp", o->previous.stamp);
    sm_json_int(t, "left_out_lines", o->previous.after_lines);
    sm_json_int(t, "left_out_bytes", o->previous.after_bytes);
    sm_json_close_object(t);
}

void sm_entry_open(struct sm_text *t, const struct sm_entry_open *o)
{
    sm_json_head(t, o->n, 0, o->utc_us, "open");
    sm_json_int(t, "format", SM_FORMAT);
    sm_json_text(t, "program", o->program);
    sm_json_int(t, "core", SM_CORE_NUMBER);
    sm_json_text(t, "arithmetic", o->arithmetic);
    sm_json_text(t, "meter", o->meter);
    sm_json_int(t, "ordinal", o->ordinal);
    write_previous(t, o);
    sm_json_words(t, "key", o->key);
    sm_json_words(t, "key_note", o->key_note);
    sm_json_words(t, "how", o->how);
    sm_json_some(t, "aged", o->aged_ns);
    sm_json_words(t, "missed", o->missed);
    sm_text_add(t, ",\"carried\":");
    sm_carried_write(t, o->carried);
    sm_json_end(t);
}

void sm_entry_file(struct sm_text *t, int64_t n, int64_t utc_us, const char *name, const char *text,
                   size_t text_n, bool sheet)
{
    sm_json_head(t, n, 0, utc_us, "file");
    sm_json_text(t, "name", name);
    sm_json_textn(t, "text", text, text_n);
    if (sheet)
        sm_json_bool(t, "sheet", true);
    sm_json_end(t);
}

void sm_entry_close(struct sm_text *t, int64_t n, int64_t t_ns, int64_t utc_us, const char *why)
{
    sm_json_head(t, n, t_ns, utc_us, "close");
    sm_json_words(t, "why", why);
    sm_json_end(t);
}

void sm_entry_stamp(struct sm_text *t, int64_t n, int64_t t_ns, int64_t utc_us, int64_t from,
                    const char hash_hex[65], const char *sig_hex)
{
    sm_json_head(t, n, t_ns, utc_us, "stamp");
    sm_json_int(t, "from", from);
    sm_json_text(t, "hash", hash_hex);
    if (sig_hex != NULL)
        sm_json_text(t, "sig", sig_hex);
    sm_json_end(t);
}
