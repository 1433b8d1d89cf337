/* SPDX-License-Identifier: GPL-3.0-or-later */
/* door_serial.h: libserialport's part of the real door; used by door.c alone. */
#ifndef SM_DAEMON_DOOR_SERIAL_H
#define SM_DAEMON_DOOR_SERIAL_H
#include "door.h"

int sm_door_serial_open(const struct sm_door *d, const char *device, struct sp_port **ret_port,
                        int *ret_fd);
int sm_door_serial_close(const struct sm_door *d, struct sp_port *port);
int sm_door_serial_setup(const struct sm_door *d, struct sp_port *port,
                         const struct sm_port_setup *setup);
int sm_door_serial_identity(const struct sm_door *d, const char *device, char *ret_text,
                            size_t cap);
#endif
