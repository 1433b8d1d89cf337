/* SPDX-License-Identifier: GPL-3.0-or-later */
/* whole_file.c: a file mapped into memory. */
#include "whole_file.h"

#include <errno.h>
#include <fcntl.h>
#include <sys/mman.h>
#include <sys/stat.h>
#include <unistd.h>

int sm_whole_file_open(const char *path, struct sm_whole_file *ret_file)
{
    const int fd = open(path, O_RDONLY | O_CLOEXEC | O_NONBLOCK | O_NOCTTY);
    struct stat st;
    void *at = NULL;
    int err = 0;

    if (fd < 0)
        return -errno;
    if (fstat(fd, &st) != 0)
        err = -errno;
    else if (!S_ISREG(st.st_mode))
        err = S_ISDIR(st.st_mode) ? -EISDIR : -EINVAL;
    else if (st.st_size > 0) {
        at = mmap(NULL, (size_t)st.st_size, PROT_READ, MAP_PRIVATE, fd, 0);
        if (at == MAP_FAILED)
            err = -errno;
    }
    close(fd);
    if (err != 0)
        return err;
    ret_file->n = (size_t)st.st_size;
    ret_file->mapped = at;
    ret_file->text = at == NULL ? "" : at;
    return 0;
}

void sm_whole_file_close(struct sm_whole_file *f)
{
    if (f->mapped != NULL)
        munmap(f->mapped, f->n);
    f->mapped = NULL;
}
