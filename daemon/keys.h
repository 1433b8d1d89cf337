/* SPDX-License-Identifier: GPL-3.0-or-later */
/* keys.h: the key that signs stamps. STATE/key holds its 32 bytes (0600), STATE/key.pub the public
 * key in hex, for whoever verifies. Made at the first start. */
#ifndef SM_DAEMON_KEYS_H
#define SM_DAEMON_KEYS_H
#include <stdbool.h>

#include "base/status.h"
#include "door.h"
#include "record/chain.h"

/* logs_exist: a missing key is then a loss, and ret_note says so for the `open` of the next files.
 *   SM_EIO     a file or folder cannot be read or made
 *   SM_EINVAL  the key can be read by others, or is no key
 *   SM_ENOMEM
 * ret_why says what to do. */
SM_MUST_CHECK enum sm_status sm_keys_load(const struct sm_door *door, const char *state,
                                          bool logs_exist, struct sm_signer **ret_signer,
                                          char ret_note[SM_REASON_SIZE], char ret_why[512]);

/* Makes a folder and what is missing above it. SM_EIO: ret_why. */
SM_MUST_CHECK enum sm_status sm_make_folder(const struct sm_door *door, const char *path,
                                            mode_t mode, char ret_why[512]);
#endif
