/* SPDX-License-Identifier: GPL-3.0-or-later */
/* small_log.h: a bench log of a few groups, stamped as the daemon does, for tests. Everything in it
 * is made up; the key is the seed of all bytes 7. */
#ifndef SM_SMALL_LOG_H
#define SM_SMALL_LOG_H
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "check.h"
#include "record/chain.h"
#include "record/entry.h"

struct small_log {
    struct sm_text t;
    struct sm_hasher *hasher;
    struct sm_signer *signer;
    char key[SM_KEY_HEX], hash[SM_HASH_HEX];
    int64_t n, t_ns, utc_us, ordinal; /* n: the next */
    int64_t from;                     /* first entry not under a stamp */
    size_t hash_from;                 /* first byte not hashed yet */
    struct sm_carried *carried;
};

static inline void small_log_begin(struct small_log *l, char *buf, size_t cap)
{
    unsigned char seed[32];

    memset(l, 0, sizeof *l);
    memset(seed, 7, sizeof seed);
    sm_text_init(&l->t, buf, cap);
    assert_int_equal(sm_hasher_create(&l->hasher), SM_OK);
    assert_int_equal(sm_signer_create(seed, &l->signer), SM_OK);
    sm_signer_public(l->signer, l->key);
    l->n = l->from = 58210;
    l->utc_us = 1796112723000000;
    l->ordinal = 412;
    l->carried = calloc(1, sizeof *l->carried);
    assert_non_null(l->carried);
    sm_carried_init(l->carried);
}

static inline void small_log_end(struct small_log *l)
{
    sm_hasher_destroy(l->hasher);
    sm_signer_destroy(l->signer);
    free(l->carried);
}

static inline void small_log_open(struct small_log *l, int64_t previous, const char *stamp)
{
    struct sm_entry_open o = { .n = l->n++,
                               .utc_us = l->utc_us,
                               .program = "0.1.0",
                               .arithmetic = "0123456789abcdef",
                               .key = l->key,
                               .key_note = "",
                               .meter = "bench-2",
                               .ordinal = l->ordinal,
                               .how = previous > 0 ? "rollover" : "first",
                               .missed = "",
                               .carried = l->carried };

    o.previous.has = previous > 0;
    o.previous.ordinal = previous;
    sm_text_copy(o.previous.stamp, sizeof o.previous.stamp, stamp);
    sm_entry_open(&l->t, &o);
    sm_entry_file(&l->t, l->n++, l->utc_us, "conf/methods/made-up.yaml", "measures: pH\n", 13,
                  false);
}

static inline void small_log_time(struct small_log *l, int64_t ms)
{
    l->t_ns += ms * 1000000;
    l->utc_us += ms * 1000;
}

static inline void small_log_bytes(struct small_log *l, const char *line)
{
    struct sm_input in = {
        .kind = SM_INPUT_BYTES, .n = l->n++, .t_ns = l->t_ns, .utc_us = l->utc_us
    };

    in.chunk.bytes = (const unsigned char *)line;
    in.chunk.n = strlen(line);
    sm_entry_input(&l->t, &in);
}

static inline void small_log_stamp(struct small_log *l, bool sign)
{
    char sig[SM_SIG_HEX];
    const size_t here = l->t.len;

    sm_hasher_add(l->hasher, l->t.buf + l->hash_from, here - l->hash_from);
    sm_hasher_take(l->hasher, l->hash);
    if (sign)
        assert_int_equal(sm_signer_sign(l->signer, "bench-2", l->ordinal, l->n, l->hash, sig),
                         SM_OK);
    sm_entry_stamp(&l->t, l->n, l->t_ns, l->utc_us, l->from, l->hash, sign ? sig : NULL);
    l->from = ++l->n;
    l->hash_from = here;
    assert_false(l->t.cut);
}

static inline void small_log_carried(struct small_log *l)
{
    struct sm_event e = {
        .kind = SM_EVENT_CARRIED, .n = l->n++, .t_ns = l->t_ns, .utc_us = l->utc_us
    };

    e.u.carried = l->carried;
    sm_entry_event(&l->t, &e);
}

/* So many groups of readings, every third signed; open, not closed. */
static inline void small_log_fill(struct small_log *l, unsigned groups)
{
    for (unsigned g = 0; g < groups; g++) {
        for (unsigned i = 0; i < 4; i++) {
            char line[32];

            small_log_time(l, 250);
            snprintf(line, sizeof line, "-0%02u.%u mV  24.8 C\r\n", 50 + g, i);
            small_log_bytes(l, line);
        }
        l->carried->captures = g + 1;
        small_log_carried(l);
        small_log_stamp(l, g % 3 == 2);
    }
}

static inline void small_log_close(struct small_log *l)
{
    sm_entry_close(&l->t, l->n++, l->t_ns, l->utc_us, "stopped");
    small_log_stamp(l, true);
}
#endif
