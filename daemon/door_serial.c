/* SPDX-License-Identifier: GPL-3.0-or-later */
/* door_serial.c: libserialport behind the door. Its own error texts are not used: they say
 * "Success" for a path it does not like, so the caller makes a sentence of the result and the step.
 */
#include "door_serial.h"

#include <errno.h>
#include <fcntl.h>
#include <libserialport.h>
#include <string.h>

#include "base/text.h"

/* Its return code as -errno; errno is what the failing call left. */
static int from_sp(enum sp_return r)
{
    switch (r) {
    case SP_ERR_ARG:
        return -EINVAL;
    case SP_ERR_MEM:
        return -ENOMEM;
    case SP_ERR_SUPP:
        return -EOPNOTSUPP;
    case SP_ERR_FAIL:
        return errno != 0 ? -errno : -EIO;
    default:
        return (int)r >= 0 ? 0 : -EIO;
    }
}

int sm_door_serial_open(const struct sm_door *d, const char *device, struct sp_port **ret_port,
                        int *ret_fd)
{
    struct sp_port *port = NULL;
    int fd = -1, r;

    (void)d;
    errno = 0;
    r = from_sp(sp_get_port_by_name(device, &port));
    if (r < 0)
        return r;
    errno = 0;
    r = from_sp(sp_open(port, SP_MODE_READ_WRITE));
    if (r < 0) {
        sp_free_port(port);
        return r;
    }
    r = from_sp(sp_get_port_handle(port, &fd));
    if (r == 0 && fcntl(fd, F_SETFD, FD_CLOEXEC) < 0) /* libserialport leaves it inheritable */
        r = -errno;
    if (r < 0) {
        (void)sp_close(port);
        sp_free_port(port);
        return r;
    }
    *ret_port = port;
    *ret_fd = fd;
    return 0;
}

int sm_door_serial_close(const struct sm_door *d, struct sp_port *port)
{
    int r;

    (void)d;
    errno = 0;
    r = from_sp(sp_close(port));
    sp_free_port(port);
    return r;
}

static enum sp_parity parity_of(enum sm_parity p)
{
    switch (p) {
    case SM_PARITY_EVEN:
        return SP_PARITY_EVEN;
    case SM_PARITY_ODD:
        return SP_PARITY_ODD;
    case SM_PARITY_MARK:
        return SP_PARITY_MARK;
    case SM_PARITY_SPACE:
        return SP_PARITY_SPACE;
    default:
        return SP_PARITY_NONE;
    }
}

static enum sp_flowcontrol flow_of(enum sm_flow f)
{
    switch (f) {
    case SM_FLOW_RTS_CTS:
        return SP_FLOWCONTROL_RTSCTS;
    case SM_FLOW_XON_XOFF:
        return SP_FLOWCONTROL_XONXOFF;
    default:
        return SP_FLOWCONTROL_NONE;
    }
}

int sm_door_serial_setup(const struct sm_door *d, struct sp_port *port,
                         const struct sm_port_setup *setup)
{
    int r;

    (void)d;
    errno = 0;
    if ((r = from_sp(sp_set_baudrate(port, (int)setup->baud))) < 0 ||
        (r = from_sp(sp_set_bits(port, (int)setup->bits))) < 0 ||
        (r = from_sp(sp_set_parity(port, parity_of(setup->parity)))) < 0 ||
        (r = from_sp(sp_set_stopbits(port, (int)setup->stop))) < 0 ||
        (r = from_sp(sp_set_flowcontrol(port, flow_of(setup->flow)))) < 0 ||
        (r = from_sp(sp_set_dtr(port, setup->dtr ? SP_DTR_ON : SP_DTR_OFF))) < 0)
        return r;
    if (setup->flow == SM_FLOW_RTS_CTS) /* the driver's own then */
        return 0;
    return from_sp(sp_set_rts(port, setup->rts ? SP_RTS_ON : SP_RTS_OFF));
}

int sm_door_serial_identity(const struct sm_door *d, const char *device, char *ret_text, size_t cap)
{
    struct sp_port *port = NULL;
    struct sm_text t;
    int vendor = 0, product = 0, r;

    (void)d;
    sm_text_init(&t, ret_text, cap);
    errno = 0;
    r = from_sp(sp_get_port_by_name(device, &port));
    if (r < 0)
        return r;
    if (sp_get_port_transport(port) == SP_TRANSPORT_USB) {
        const char *serial = sp_get_port_usb_serial(port);
        if (sp_get_port_usb_vid_pid(port, &vendor, &product) == SP_OK)
            sm_text_addf(&t, "usb %04x:%04x", (unsigned)vendor, (unsigned)product);
        if (serial != NULL) {
            sm_text_add(&t, " serial ");
            sm_text_add_safe(&t, serial, strlen(serial)); /* the adapter's own bytes */
        }
    }
    sp_free_port(port);
    return 0;
}
