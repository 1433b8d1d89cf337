/* SPDX-License-Identifier: GPL-3.0-or-later */
/* status.c: the words for a status. */
#include "base/status.h"

const char *sm_status_text(enum sm_status s)
{
    switch (s) {
    case SM_OK:
        return "done";
    case SM_EINVAL:
        return "out of range";
    case SM_EVALUE:
        return "a value that cannot be used";
    case SM_EORDER:
        return "out of order";
    case SM_ESHORT:
        return "not enough yet";
    case SM_EFULL:
        return "full";
    case SM_ESYNTAX:
        return "not of the form expected";
    case SM_EBUSY:
        return "busy";
    case SM_ENOMEM:
        return "no memory";
    case SM_EIO:
        return "input or output failed";
    case SM_EUNKNOWN:
        return "unknown name";
    }
    return "unknown status";
}
