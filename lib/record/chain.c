/* SPDX-License-Identifier: GPL-3.0-or-later */
/* chain.c: SHA-256 (FIPS 180-4) and Ed25519 (RFC 8032) by libcrypto. */
#include "record/chain.h"

#include <openssl/evp.h>
#include <stdlib.h>
#include <string.h>

struct sm_hasher {
    EVP_MD *how;
    EVP_MD_CTX *ctx;
};

struct sm_signer {
    EVP_PKEY *key;
};

static void to_hex(const unsigned char *bytes, size_t n, char *out)
{
    static const char hex[] = "0123456789abcdef";

    for (size_t i = 0; i < n; i++) {
        out[2 * i] = hex[bytes[i] >> 4];
        out[2 * i + 1] = hex[bytes[i] & 15];
    }
    out[2 * n] = '\0';
}

static int digit(char c)
{
    if (c >= '0' && c <= '9')
        return c - '0';
    if (c >= 'a' && c <= 'f')
        return c - 'a' + 10;
    return -1;
}

/* Exactly 2n lower-case digits. */
static bool from_hex(const char *s, unsigned char *out, size_t n)
{
    if (strlen(s) != 2 * n)
        return false;
    for (size_t i = 0; i < n; i++) {
        const int high = digit(s[2 * i]), low = digit(s[2 * i + 1]);
        if (high < 0 || low < 0)
            return false;
        out[i] = (unsigned char)(high << 4 | low);
    }
    return true;
}

/* ---- hash ---- */

enum sm_status sm_hasher_create(struct sm_hasher **ret_hasher)
{
    struct sm_hasher *h = calloc(1, sizeof *h);

    if (h == NULL)
        return SM_ENOMEM;
    h->how = EVP_MD_fetch(NULL, "SHA256", NULL);
    h->ctx = EVP_MD_CTX_new();
    if (h->how == NULL || h->ctx == NULL || EVP_DigestInit_ex2(h->ctx, h->how, NULL) != 1) {
        sm_hasher_destroy(h);
        return SM_ENOMEM;
    }
    *ret_hasher = h;
    return SM_OK;
}

void sm_hasher_destroy(struct sm_hasher *h)
{
    if (h == NULL)
        return;
    EVP_MD_CTX_free(h->ctx);
    EVP_MD_free(h->how);
    free(h);
}

/* Once begun, SHA-256 in memory has nothing to fail at; if it did, no hash may come out of it. */
static void must(int ok)
{
    if (ok != 1)
        abort();
}

void sm_hasher_add(struct sm_hasher *h, const char *bytes, size_t n)
{
    must(EVP_DigestUpdate(h->ctx, bytes, n));
}

void sm_hasher_take(struct sm_hasher *h, char ret_hex[SM_HASH_HEX])
{
    unsigned char sum[EVP_MAX_MD_SIZE];

    must(EVP_DigestFinal_ex(h->ctx, sum, NULL));
    must(EVP_DigestInit_ex2(h->ctx, NULL, NULL));
    to_hex(sum, 32, ret_hex);
}

/* ---- signature ---- */

#define STATEMENT_SIZE 256

/* "stillmark stamp 1 METER ORDINAL N HASH" */
static void write_statement(struct sm_text *t, const char *meter, int64_t ordinal, int64_t n,
                            const char *hash_hex)
{
    sm_text_addf(t, "stillmark stamp 1 %s %lld %lld %s", meter, (long long)ordinal, (long long)n,
                 hash_hex);
}

enum sm_status sm_signer_create(const unsigned char seed[32], struct sm_signer **ret)
{
    struct sm_signer *s = calloc(1, sizeof *s);

    if (s == NULL)
        return SM_ENOMEM;
    s->key = EVP_PKEY_new_raw_private_key(EVP_PKEY_ED25519, NULL, seed, 32);
    if (s->key == NULL) {
        free(s);
        return SM_ENOMEM;
    }
    *ret = s;
    return SM_OK;
}

void sm_signer_destroy(struct sm_signer *s)
{
    if (s == NULL)
        return;
    EVP_PKEY_free(s->key);
    free(s);
}

void sm_signer_public(const struct sm_signer *s, char ret_hex[SM_KEY_HEX])
{
    unsigned char key[32];
    size_t n = sizeof key;

    must(EVP_PKEY_get_raw_public_key(s->key, key, &n));
    to_hex(key, n, ret_hex);
}

enum sm_status sm_signer_sign_text(const struct sm_signer *s, const char *text, size_t n,
                                   char ret_sig_hex[SM_SIG_HEX])
{
    unsigned char sig[64];
    size_t sig_n = sizeof sig;
    EVP_MD_CTX *ctx = EVP_MD_CTX_new();
    const bool ok = ctx != NULL && EVP_DigestSignInit(ctx, NULL, NULL, NULL, s->key) == 1 &&
                    EVP_DigestSign(ctx, sig, &sig_n, (const unsigned char *)text, n) == 1 &&
                    sig_n == sizeof sig;

    EVP_MD_CTX_free(ctx);
    if (!ok)
        return SM_ENOMEM;
    to_hex(sig, sizeof sig, ret_sig_hex);
    return SM_OK;
}

enum sm_status sm_signature_check_text(const char *key_hex, const char *text, size_t n,
                                       const char *sig_hex)
{
    unsigned char key[32], sig[64];
    EVP_PKEY *public;
    EVP_MD_CTX *ctx;
    bool ok = false;

    if (!from_hex(key_hex, key, sizeof key) || !from_hex(sig_hex, sig, sizeof sig))
        return SM_EVALUE;
    public = EVP_PKEY_new_raw_public_key(EVP_PKEY_ED25519, NULL, key, sizeof key);
    ctx = EVP_MD_CTX_new();
    if (public != NULL && ctx != NULL)
        ok = EVP_DigestVerifyInit(ctx, NULL, NULL, NULL, public) == 1 &&
             EVP_DigestVerify(ctx, sig, sizeof sig, (const unsigned char *)text, n) == 1;
    EVP_MD_CTX_free(ctx);
    EVP_PKEY_free(public);
    return ok ? SM_OK : SM_EVALUE;
}

enum sm_status sm_signer_sign(const struct sm_signer *s, const char *meter, int64_t ordinal,
                              int64_t n, const char *hash_hex, char ret_sig_hex[SM_SIG_HEX])
{
    char buf[STATEMENT_SIZE];
    struct sm_text t;

    sm_text_init(&t, buf, sizeof buf);
    write_statement(&t, meter, ordinal, n, hash_hex);
    return t.cut ? SM_EINVAL : sm_signer_sign_text(s, t.buf, t.len, ret_sig_hex);
}

enum sm_status sm_signature_check(const char *key_hex, const char *meter, int64_t ordinal,
                                  int64_t n, const char *hash_hex, const char *sig_hex)
{
    char buf[STATEMENT_SIZE];
    struct sm_text t;

    sm_text_init(&t, buf, sizeof buf);
    write_statement(&t, meter, ordinal, n, hash_hex);
    return t.cut ? SM_EVALUE : sm_signature_check_text(key_hex, t.buf, t.len, sig_hex);
}

enum sm_status sm_key_fingerprint(const char *key_hex, char ret_hex[17])
{
    unsigned char key[32], sum[32];
    char hex[65];

    if (!from_hex(key_hex, key, sizeof key))
        return SM_ESYNTAX;
    if (EVP_Q_digest(NULL, "SHA256", NULL, key, sizeof key, sum, NULL) != 1)
        return SM_ENOMEM;
    to_hex(sum, sizeof sum, hex);
    memcpy(ret_hex, hex, 16);
    ret_hex[16] = '\0';
    return SM_OK;
}
