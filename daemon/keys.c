/* SPDX-License-Identifier: GPL-3.0-or-later */
/* keys.c: the signing key: read, or made at the first start. */
#include "keys.h"

#include <errno.h>
#include <fcntl.h>
#include <stdio.h>
#include <string.h>

#define KEY_BYTES 32

enum sm_status sm_make_folder(const struct sm_door *door, const char *path, mode_t mode,
                              char ret_why[512])
{
    char part[512];
    const size_t n = strlen(path);
    int r = 0;

    if (n == 0 || n >= sizeof part) {
        snprintf(ret_why, 512, "a folder's path has %zu bytes, expected 1 to %zu", n,
                 sizeof part - 1);
        return SM_EIO;
    }
    for (size_t i = 1; i <= n; i++) {
        struct stat st;
        if (path[i] != '/' && path[i] != '\0')
            continue;
        memcpy(part, path, i);
        part[i] = '\0';
        r = door->stat(door, part, &st);
        if (r == -ENOENT)
            r = door->mkdir(door, part, mode);
        if (r < 0 && r != -EEXIST) {
            snprintf(ret_why, 512, "%.300s: the folder cannot be reached or made: %s", part,
                     sm_door_text(r));
            return SM_EIO;
        }
    }
    return SM_OK;
}

/* Whole file of exactly KEY_BYTES; the descriptor is given back by the caller. */
static enum sm_status read_key(const struct sm_door *door, int fd, const char *path,
                               unsigned char ret_seed[KEY_BYTES], char ret_why[512])
{
    unsigned char buf[KEY_BYTES + 1];
    struct stat st;
    size_t n = 0;
    ssize_t got = door->fstat(door, fd, &st);

    if (got < 0) {
        snprintf(ret_why, 512, "%.300s: %s", path, sm_door_text((int)got));
        return SM_EIO;
    }
    if ((st.st_mode & 077) != 0) {
        snprintf(ret_why, 512,
                 "%.120s: others may read the signing key (mode %04o). If nobody did: chmod 600 "
                 "%.120s; else move it away, and a new one is made",
                 path, (unsigned)(st.st_mode & 07777), path);
        return SM_EINVAL;
    }
    while (n < sizeof buf && (got = door->read(door, fd, buf + n, sizeof buf - n)) > 0)
        n += (size_t)got;
    if (got < 0) {
        snprintf(ret_why, 512, "%.300s: %s", path, sm_door_text((int)got));
        return SM_EIO;
    }
    if (n != KEY_BYTES) {
        snprintf(ret_why, 512,
                 "%.300s: is no signing key (expected %d bytes). Put the right one back, or move "
                 "it away, and a new one is made",
                 path, KEY_BYTES);
        return SM_EINVAL;
    }
    memcpy(ret_seed, buf, KEY_BYTES);
    return SM_OK;
}

/* Written beside it and renamed, so that a crash leaves a whole key or none. */
static int write_file(const struct sm_door *door, const char *state, const char *name, mode_t mode,
                      const void *bytes, size_t n)
{
    char path[512], beside[520];
    ssize_t r;
    int fd;

    snprintf(path, sizeof path, "%.400s/%s", state, name);
    snprintf(beside, sizeof beside, "%s.new", path);
    fd = door->open(door, beside, O_WRONLY | O_CREAT | O_TRUNC, mode);
    if (fd < 0)
        return fd;
    r = door->write(door, fd, bytes, n);
    if (r >= 0 && (size_t)r != n)
        r = -ENOSPC;
    if (r >= 0)
        r = door->fsync(door, fd);
    (void)door->close(door, fd);
    if (r >= 0)
        r = door->rename(door, beside, path);
    if (r < 0)
        return (int)r;
    fd = door->open(door, state, O_RDONLY | O_DIRECTORY, 0);
    if (fd < 0)
        return fd;
    r = door->fsync(door, fd);
    (void)door->close(door, fd);
    return (int)r;
}

static enum sm_status make_key(const struct sm_door *door, const char *state,
                               unsigned char ret_seed[KEY_BYTES], char ret_why[512])
{
    unsigned char seed[KEY_BYTES];
    int r = door->random(door, seed, sizeof seed);

    if (r >= 0)
        r = write_file(door, state, "key", 0600, seed, sizeof seed);
    if (r < 0) {
        snprintf(ret_why, 512, "%.300s/key: the signing key cannot be made: %s", state,
                 sm_door_text(r));
        return SM_EIO;
    }
    memcpy(ret_seed, seed, sizeof seed);
    return SM_OK;
}

static enum sm_status write_public(const struct sm_door *door, const char *state,
                                   const struct sm_signer *signer, char ret_why[512])
{
    char line[SM_KEY_HEX + 1];
    size_t n;
    int r;

    sm_signer_public(signer, line);
    n = strlen(line);
    line[n++] = '\n';
    r = write_file(door, state, "key.pub", 0644, line, n);
    if (r < 0) {
        snprintf(ret_why, 512, "%.300s/key.pub: %s", state, sm_door_text(r));
        return SM_EIO;
    }
    return SM_OK;
}

enum sm_status sm_keys_load(const struct sm_door *door, const char *state, bool logs_exist,
                            struct sm_signer **ret_signer, char ret_note[SM_REASON_SIZE],
                            char ret_why[512])
{
    unsigned char seed[KEY_BYTES];
    char path[512];
    struct sm_signer *signer;
    bool made = false;
    struct stat st;
    enum sm_status s = sm_make_folder(door, state, 0750, ret_why);
    int fd;

    if (s != SM_OK)
        return s;
    snprintf(path, sizeof path, "%.400s/key", state);
    fd = door->open(door, path, O_RDONLY, 0);
    if (fd >= 0) {
        s = read_key(door, fd, path, seed, ret_why);
        (void)door->close(door, fd);
    } else if (fd == -ENOENT) {
        s = make_key(door, state, seed, ret_why);
        made = true;
    } else {
        snprintf(ret_why, 512, "%.300s: %s", path, sm_door_text(fd));
        s = SM_EIO;
    }
    if (s != SM_OK)
        return s;
    s = sm_signer_create(seed, &signer);
    explicit_bzero(seed, sizeof seed);
    if (s != SM_OK) {
        snprintf(ret_why, 512, "%.300s: %s", path, sm_status_text(s));
        return s;
    }
    snprintf(path, sizeof path, "%.400s/key.pub", state);
    if (made || door->stat(door, path, &st) == -ENOENT)
        s = write_public(door, state, signer, ret_why);
    if (s != SM_OK) {
        sm_signer_destroy(signer);
        return s;
    }
    ret_note[0] = '\0';
    if (made && logs_exist)
        snprintf(ret_note, SM_REASON_SIZE,
                 "new key: the one that signed the earlier files is missing");
    *ret_signer = signer;
    return SM_OK;
}
