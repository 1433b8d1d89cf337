/* SPDX-License-Identifier: GPL-3.0-or-later */
/* stillmark_main.c: the command of the bench: acts, status, fits and logs. */
#include <gsl/gsl_errno.h>
#include <stdio.h>

#include "stillmark_commands.h"

int main(int argc, char **argv)
{
    int status;

    gsl_set_error_handler_off();
    status = sm_stillmark(argc, argv);
    if (fflush(stdout) == 0 && ferror(stdout) == 0)
        return status;
    fputs("stillmark: what it has to say cannot be written\n", stderr);
    return 2;
}
