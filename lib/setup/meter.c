/* SPDX-License-Identifier: GPL-3.0-or-later */
/* meter.c: a file of conf/meters/: port, line settings, silence and sensor. */
#include <string.h>

#include "base/time.h"
#include "setup/parts.h"

static void fill_port(const struct sm_reader *r, const struct sm_node *node,
                      struct sm_port_setup *p)
{
    if (sm_get_text(r, node, "a device such as /dev/serial/by-id/…", p->port, sizeof p->port) &&
        p->port[0] != '/')
        sm_blame_got(r, node, "expected a path from the root, such as /dev/serial/by-id/…");
}

static void fill_line(const struct sm_reader *r, const struct sm_node *map, struct sm_port_setup *p)
{
    static const char *const keys[] = {
        "baud", "bits", "parity", "stop", "flow", "dtr", "rts", NULL
    };
    static const char *const parities[] = { "none", "even", "odd", "mark", "space" };
    static const char *const flows[] = { "none", "rts-cts", "xon-xoff" };
    size_t at = 0;

    p->baud = 9600;
    p->bits = 8;
    p->stop = 1;
    p->dtr = p->rts = true;
    if (!sm_keys_known(r, map, keys))
        return;
    sm_get_count(r, sm_key(map, "baud"), 50, 4000000, &p->baud);
    sm_get_count(r, sm_key(map, "bits"), 5, 8, &p->bits);
    if (sm_get_choice(r, sm_key(map, "parity"), parities, 5, &at))
        p->parity = (enum sm_parity)at;
    sm_get_count(r, sm_key(map, "stop"), 1, 2, &p->stop);
    if (sm_get_choice(r, sm_key(map, "flow"), flows, 3, &at))
        p->flow = (enum sm_flow)at;
    sm_get_yes(r, sm_key(map, "dtr"), &p->dtr);
    sm_get_yes(r, sm_key(map, "rts"), &p->rts);
}

void sm_meter_fill(const struct sm_reader *r, const struct sm_node *root, struct sm_meter_setup *m)
{
    static const char *const keys[] = { "port",    "line",   "other-adapter", "silence",
                                        "profile", "method", "sensor",        NULL };
    static const char *const adapters[] = { "refuse", "allow" };
    size_t at = 0;

    m->core.silence_ns = 10 * SM_NS_PER_S;
    if (!sm_keys_known(r, root, keys))
        return;
    fill_port(r, sm_need(r, root, "port", "a device such as /dev/serial/by-id/…"), &m->port);
    fill_line(r, sm_key(root, "line"), &m->port);
    if (sm_get_choice(r, sm_key(root, "other-adapter"), adapters, 2, &at))
        m->port.other_adapter = at == 1;
    sm_get_time(r, sm_key(root, "silence"), SM_NS_PER_S, 3600 * SM_NS_PER_S, &m->core.silence_ns);
    sm_get_name(r, sm_need(r, root, "sensor", "the electrode's, cell's or cuvette's name"),
                "a sensor's name", m->core.sensor);
}
