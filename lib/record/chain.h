/* SPDX-License-Identifier: GPL-3.0-or-later */
/* chain.h: stamps: SHA-256 over the entries of each group written together, often signed (Ed25519).
 */
#ifndef SM_RECORD_CHAIN_H
#define SM_RECORD_CHAIN_H
#include <stdbool.h>
#include <stddef.h>
#include <stdint.h>

#include "base/status.h"
#include "base/text.h"

#define SM_HASH_HEX 65 /* with NUL */
#define SM_SIG_HEX 129
#define SM_KEY_HEX 65 /* public key, hex */

struct sm_hasher; /* SHA-256, fetched once, reused */
SM_MUST_CHECK enum sm_status sm_hasher_create(struct sm_hasher **ret_hasher);
void sm_hasher_destroy(struct sm_hasher *h);
void sm_hasher_add(struct sm_hasher *h, const char *bytes, size_t n);
/* The hash so far; then begins anew. */
void sm_hasher_take(struct sm_hasher *h, char ret_hex[SM_HASH_HEX]);

struct sm_signer; /* an Ed25519 private key */
/* From 32 raw bytes. */
SM_MUST_CHECK enum sm_status sm_signer_create(const unsigned char seed[32], struct sm_signer **ret);
void sm_signer_destroy(struct sm_signer *s);
void sm_signer_public(const struct sm_signer *s, char ret_hex[SM_KEY_HEX]);
/* Signs "stillmark stamp 1 METER ORDINAL N HASH". */
SM_MUST_CHECK enum sm_status sm_signer_sign(const struct sm_signer *s, const char *meter,
                                            int64_t ordinal, int64_t n, const char *hash_hex,
                                            char ret_sig_hex[SM_SIG_HEX]);
/* SM_EVALUE: the signature is not by this key over this text. */
SM_MUST_CHECK enum sm_status sm_signature_check(const char *key_hex, const char *meter,
                                                int64_t ordinal, int64_t n, const char *hash_hex,
                                                const char *sig_hex);
/* The same over any text; what is signed in a log is always a statement as above. */
SM_MUST_CHECK enum sm_status sm_signer_sign_text(const struct sm_signer *s, const char *text,
                                                 size_t n, char ret_sig_hex[SM_SIG_HEX]);
SM_MUST_CHECK enum sm_status sm_signature_check_text(const char *key_hex, const char *text,
                                                     size_t n, const char *sig_hex);
/* Short form for people: first 16 hex digits of the SHA-256 of the raw public key. */
SM_MUST_CHECK enum sm_status sm_key_fingerprint(const char *key_hex, char ret_hex[17]);
#endif
