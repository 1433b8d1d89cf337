/* SPDX-License-Identifier: GPL-3.0-or-later */
/* stillmark_words.h: the words of a command that talks to the daemon: options, and what is left. */
#ifndef SM_DAEMON_STILLMARK_WORDS_H
#define SM_DAEMON_STILLMARK_WORDS_H
#include <stdbool.h>
#include <stddef.h>
#include <stdint.h>

#define SM_EXIT_DONE 0
#define SM_EXIT_NO 1        /* done, and the answer is no */
#define SM_EXIT_COULD_NOT 2 /* one line on standard error says why */

#define SM_TYPED_MAX 64

struct sm_words {
    const char *socket, *meter, *who, *why, *id; /* NULL: not given */
    bool has_seen, has_from;
    int64_t seen, from;
    bool json, help, held;
    const char *word[SM_TYPED_MAX]; /* what is no option, in order */
    size_t n;
};

/* Options a command takes, besides --socket, --json and --help. */
enum {
    SM_WORDS_METER = 1,
    SM_WORDS_ACT = 2, /* --who --why --seen --id */
    SM_WORDS_HELD = 4,
    SM_WORDS_FROM = 8
};

/* argv[argc] are the words after the command's own; after "--" everything is a word, and so is a
 * negative number. False: said on standard error, about `command`, what is not understood. */
bool sm_words_read(const char *command, unsigned takes, int argc, char **argv,
                   struct sm_words *ret_words);

/* All words with one blank between them. False: longer than cap - 1 bytes. */
bool sm_words_joined(const struct sm_words *w, char *ret_text, size_t cap);
#endif
