/* SPDX-License-Identifier: GPL-3.0-or-later */
/* request.c: what a client asks for. */
#include <jansson.h>
#include <stdio.h>
#include <string.h>

#include "act_read.h"
#include "client.h"
#include "record/entry.h"
#include "record/json.h"
#include "record/load.h"

static void names(const struct sm_hub *h, struct sm_text *t)
{
    for (size_t i = 0; i < h->about.n_meters; i++)
        sm_text_addf(t, "%s%s", i > 0 ? ", " : "", sm_meter_name(h->about.meter[i]));
}

/* The meter that is named, or the only one; NULL: the client was told why not. */
static struct sm_meter *meter_of(struct client *c, const json_t *o, const char *id)
{
    const struct sm_hub *h = c->hub;
    const json_t *v = json_object_get(o, "meter");
    const char *name = json_string_value(v);
    char why[1200];
    struct sm_text t;

    sm_text_init(&t, why, sizeof why);
    if (v == NULL && h->about.n_meters == 1)
        return h->about.meter[0];
    for (size_t i = 0; name != NULL && i < h->about.n_meters; i++)
        if (strcmp(name, sm_meter_name(h->about.meter[i])) == 0)
            return h->about.meter[i];
    if (v == NULL) {
        sm_text_add(&t, "there are several meters; name one of: ");
    } else {
        sm_text_add(&t, "no meter is called ");
        sm_text_add_safe(&t, name != NULL ? name : "so", name != NULL ? strnlen(name, 40) : 2);
        sm_text_add(&t, "; there are: ");
    }
    names(h, &t);
    client_error(c, id, why);
    return NULL;
}

static void on_status(struct client *c, const json_t *o)
{
    const struct sm_hub *h = c->hub;
    const struct sm_now *now = h->about.stamp(h->about.ctx);
    const bool named = json_object_get(o, "meter") != NULL;
    struct sm_meter *only = NULL;
    struct sm_text t;

    if (named && (only = meter_of(c, o, NULL)) == NULL)
        return;
    for (size_t i = 0; i < h->about.n_meters; i++) {
        if (only != NULL && h->about.meter[i] != only)
            continue;
        sm_text_init(&t, h->line, SM_ENTRY_MAX);
        sm_meter_status(h->about.meter[i], now, only != NULL ? 1 : h->about.n_meters, &t);
        client_send(c, t.buf, t.len);
    }
}

static void on_follow(struct client *c, const json_t *o)
{
    const json_t *from = json_object_get(o, "from");
    struct sm_meter *m;

    if (c->following != FOLLOW_NOT) {
        client_error(c, NULL, "this connection follows already; open another");
        return;
    }
    if (from != NULL && (!json_is_integer(from) || json_integer_value(from) < 0)) {
        client_error(c, NULL, "from: expected the number of an entry");
        return;
    }
    m = meter_of(c, o, NULL);
    if (m != NULL)
        follow_begin(c, m, from != NULL, json_integer_value(from));
}

static void on_act(struct client *c, const json_t *o)
{
    const struct sm_hub *h = c->hub;
    char why[SM_ACT_WHY_SIZE > SM_WHY_SIZE ? SM_ACT_WHY_SIZE : SM_WHY_SIZE];
    const char *id = json_string_value(json_object_get(o, "id"));
    struct waiting *w = &c->waiting[c->n_waiting];
    struct sm_act act;
    struct sm_meter *m;
    int64_t n;

    if (sm_act_read(o, &act, why) != SM_OK) {
        client_error(c, id != NULL && strlen(id) < SM_ID_SIZE ? id : NULL, why);
        return;
    }
    m = meter_of(c, o, act.id);
    if (m == NULL)
        return;
    if (c->n_waiting == WAITING_MAX) {
        client_error(c, act.id, "too many acts wait for their answers");
        return;
    }
    snprintf(act.door, sizeof act.door, "socket");
    act.has_uid = c->has_uid;
    act.uid = c->uid;
    if (sm_meter_act(m, h->about.stamp(h->about.ctx), &act, &n, why) != SM_OK) {
        client_error(c, act.id, why);
    } else {
        c->n_waiting++;
        w->meter = m;
        w->act = n;
        memcpy(w->id, act.id, sizeof w->id);
    }
    h->about.after(h->about.ctx, m);
}

void client_request(struct client *c, const char *line, size_t n)
{
    char why[SM_REASON_SIZE];
    json_t *o = NULL;
    const char *k;

    if (n > 0 && line[n - 1] == '\r')
        n--;
    if (sm_json_load(line, n, &o, why) != SM_OK) {
        client_error(c, NULL, why);
        return;
    }
    k = json_string_value(json_object_get(o, "k"));
    if (k != NULL && strcmp(k, "status") == 0)
        on_status(c, o);
    else if (k != NULL && strcmp(k, "follow") == 0)
        on_follow(c, o);
    else if (k != NULL && strcmp(k, "act") == 0)
        on_act(c, o);
    else
        client_error(c, NULL, "k: expected \"act\", \"status\" or \"follow\"");
    json_decref(o);
}
