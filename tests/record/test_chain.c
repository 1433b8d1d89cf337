/* SPDX-License-Identifier: GPL-3.0-or-later */
/* test_chain.c: hash and signature against published values, and a log against command-line tools.
 */
#include "check.h"

#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <unistd.h>

#include "small_log.h"

static char storage[256 * 1024];

static void sha256_gives_the_published_values(void **state)
{
    /* FIPS 180-4 examples: one block, and the message of 448 bits */
    static const struct {
        const char *text, *want;
    } cases[] = {
        { "abc", "ba7816bf8f01cfea414140de5dae2223b00361a396177a9cb410ff61f20015ad" },
        { "abcdbcdecdefdefgefghfghighijhijkijkljklmklmnlmnomnopnopq",
          "248d6a61d20638b8e5c026930c3e6039a33ce45964ff2167f6ecedd419db06c1" },
        { "", "e3b0c44298fc1c149afbf4c8996fb92427ae41e4649b934ca495991b7852b855" },
    };
    struct sm_hasher *h;
    char hex[SM_HASH_HEX];

    (void)state;
    assert_int_equal(sm_hasher_create(&h), SM_OK);
    for (int round = 0; round < 2; round++)
        for (size_t i = 0; i < COUNT(cases); i++) {
            for (size_t k = 0; k < strlen(cases[i].text); k++)
                sm_hasher_add(h, cases[i].text + k, 1);
            sm_hasher_take(h, hex);
            assert_string_equal(hex, cases[i].want);
        }
    sm_hasher_destroy(h);
}

static void take_seed(const char *hex, unsigned char seed[32])
{
    for (size_t i = 0; i < 32; i++) {
        unsigned byte;

        assert_int_equal(sscanf(hex + 2 * i, "%2x", &byte), 1);
        seed[i] = (unsigned char)byte;
    }
}

static void ed25519_gives_the_published_values(void **state)
{
    /* RFC 8032 section 7.1, TEST 1 (empty message), TEST 2 (0x72), TEST 3 (0xaf82) */
    static const struct {
        const char *seed, *key, *text;
        size_t n;
        const char *sig;
    } cases[] = {
        { "9d61b19deffd5a60ba844af492ec2cc44449c5697b326919703bac031cae7f60",
          "d75a980182b10ab7d54bfed3c964073a0ee172f3daa62325af021a68f707511a", "", 0,
          "e5564300c360ac729086e2cc806e828a84877f1eb8e5d974d873e065224901555fb8821590a33bacc61e3970"
          "1c"
          "f9b46bd25bf5f0595bbe24655141438e7a100b" },
        { "4ccd089b28ff96da9db6c346ec114e0f5b8a319f35aba624da8cf6ed4fb8a6fb",
          "3d4017c3e843895a92b70aa74d1b7ebc9c982ccf2ec4968cc0cd55f12af4660c", "\x72", 1,
          "92a009a9f0d4cab8720e820b5f642540a2b27b5416503f8fb3762223ebdb69da085ac1e43e15996e458f3613"
          "d0"
          "f11d8c387b2eaeb4302aeeb00d291612bb0c00" },
        { "c5aa8df43f9f837bedb7442f31dcb7b166d38535076f094b85ce3a2e0b4458f7",
          "fc51cd8e6218a1a38da47ed00230f0580816ed13ba3303ac5deb911548908025", "\xaf\x82", 2,
          "6291d657deec24024827e69c3abe01a30ce548a284743a445e3680d7db5ac3ac18ff9b538d16f290ae67f760"
          "98"
          "4dc6594a7c15e9716ed28dc027beceea1ec40a" },
    };

    (void)state;
    for (size_t i = 0; i < COUNT(cases); i++) {
        unsigned char seed[32];
        struct sm_signer *s;
        char key[SM_KEY_HEX], sig[SM_SIG_HEX];

        take_seed(cases[i].seed, seed);
        assert_int_equal(sm_signer_create(seed, &s), SM_OK);
        sm_signer_public(s, key);
        assert_string_equal(key, cases[i].key);
        assert_int_equal(sm_signer_sign_text(s, cases[i].text, cases[i].n, sig), SM_OK);
        assert_string_equal(sig, cases[i].sig);
        assert_int_equal(sm_signature_check_text(key, cases[i].text, cases[i].n, sig), SM_OK);
        sig[5] = sig[5] == '0' ? '1' : '0';
        assert_int_equal(sm_signature_check_text(key, cases[i].text, cases[i].n, sig), SM_EVALUE);
        sm_signer_destroy(s);
    }
}

static void a_signature_holds_for_its_own_statement_alone(void **state)
{
    static const char hash[] = "ba7816bf8f01cfea414140de5dae2223b00361a396177a9cb410ff61f20015ad";
    static const char other[] = "ba7816bf8f01cfea414140de5dae2223b00361a396177a9cb410ff61f20015ae";
    const unsigned char seed[32] = { 1 }, seed2[32] = { 2 };
    struct sm_signer *s, *s2;
    char key[SM_KEY_HEX], key2[SM_KEY_HEX], sig[SM_SIG_HEX];

    (void)state;
    assert_int_equal(sm_signer_create(seed, &s), SM_OK);
    assert_int_equal(sm_signer_create(seed2, &s2), SM_OK);
    sm_signer_public(s, key);
    sm_signer_public(s2, key2);
    assert_int_equal(sm_signer_sign(s, "bench-2", 412, 61881, hash, sig), SM_OK);
    assert_int_equal(sm_signature_check(key, "bench-2", 412, 61881, hash, sig), SM_OK);
    assert_int_equal(sm_signature_check(key2, "bench-2", 412, 61881, hash, sig), SM_EVALUE);
    assert_int_equal(sm_signature_check(key, "bench-3", 412, 61881, hash, sig), SM_EVALUE);
    assert_int_equal(sm_signature_check(key, "bench-2", 413, 61881, hash, sig), SM_EVALUE);
    assert_int_equal(sm_signature_check(key, "bench-2", 412, 61882, hash, sig), SM_EVALUE);
    assert_int_equal(sm_signature_check(key, "bench-2", 412, 61881, other, sig), SM_EVALUE);
    assert_int_equal(sm_signature_check("", "bench-2", 412, 61881, hash, sig), SM_EVALUE);
    assert_int_equal(sm_signature_check(key, "bench-2", 412, 61881, hash, "zz"), SM_EVALUE);
    sm_signer_destroy(s);
    sm_signer_destroy(s2);
}

/* ---- command-line tools ---- */

static char folder[64];

static int make_folder(void **state)
{
    (void)state;
    strcpy(folder, "/tmp/stillmark-chain-XXXXXX");
    return mkdtemp(folder) != NULL ? 0 : -1;
}

static int drop_folder(void **state)
{
    char command[128];

    (void)state;
    snprintf(command, sizeof command, "rm -r '%s'", folder);
    return system(command);
}

static void put_file(const char *name, const char *bytes, size_t n)
{
    char path[128];
    FILE *f;

    snprintf(path, sizeof path, "%s/%s", folder, name);
    f = fopen(path, "wb");
    assert_non_null(f);
    assert_int_equal(fwrite(bytes, 1, n, f), n);
    assert_int_equal(fclose(f), 0);
}

/* The first line that a command prints, run in the folder. */
static void first_line(const char *command, char out[256])
{
    char whole[512];
    FILE *p;

    snprintf(whole, sizeof whole, "cd '%s' && %s", folder, command);
    p = popen(whole, "r");
    assert_non_null(p);
    if (fgets(out, 256, p) == NULL)
        out[0] = '\0';
    pclose(p);
}

/* The k-th stamp of the log (from 0): its line's number and text. */
static bool find_stamp(const char *text, unsigned k, unsigned *ret_line, const char **ret_stamp)
{
    unsigned line = 1;

    for (const char *at = text; *at != '\0'; line++) {
        const char *newline = strchr(at, '\n'), *stamp = strstr(at, "\"k\":\"stamp\"");

        assert_non_null(newline);
        if (stamp != NULL && stamp < newline && k-- == 0) {
            *ret_line = line;
            *ret_stamp = at;
            return true;
        }
        at = newline + 1;
    }
    return false;
}

static void every_stamp_checks_with_sed_and_sha256sum(void **state)
{
    struct small_log l;
    unsigned from = 1, line = 0, stamps = 0;
    const char *stamp;

    (void)state;
    small_log_begin(&l, storage, sizeof storage);
    small_log_open(&l, 0, "");
    small_log_fill(&l, 7);
    small_log_close(&l);
    put_file("log", l.t.buf, l.t.len);
    for (; find_stamp(l.t.buf, stamps, &line, &stamp); stamps++) {
        char command[128], got[256], want[65];
        const char *hash = strstr(stamp, "\"hash\":\"");

        assert_non_null(hash);
        memcpy(want, hash + 8, 64);
        want[64] = '\0';
        snprintf(command, sizeof command, "sed -n '%u,%up' log | sha256sum", from, line - 1);
        first_line(command, got);
        got[64] = '\0';
        if (strcmp(got, want) != 0)
            fail_msg("lines %u to %u: sha256sum says %s, the stamp %s", from, line - 1, got, want);
        from = line; /* the next hash begins with this stamp's line */
    }
    assert_int_equal(stamps, 8);
    small_log_end(&l);
}

/* A file of the bytes that so many pairs of hex digits say. */
static void put_hex(const char *name, const char *hex, size_t n)
{
    char bytes[128];

    assert_true(n <= sizeof bytes);
    for (size_t i = 0; i < n; i++) {
        unsigned byte;

        assert_int_equal(sscanf(hex + 2 * i, "%2x", &byte), 1);
        bytes[i] = (char)byte;
    }
    put_file(name, bytes, n);
}

/* The public key as openssl reads it (RFC 8410: these 12 bytes, then the 32 of the key). */
static void put_key(const char *key_hex)
{
    char hex[128], out[256];

    snprintf(hex, sizeof hex, "302a300506032b6570032100%s", key_hex);
    put_hex("key.der", hex, 44);
    first_line("openssl pkey -pubin -inform DER -in key.der -out key 2>&1", out);
    assert_string_equal(out, "");
}

static void signatures_check_with_openssl(void **state)
{
    struct small_log l;
    unsigned line = 0, signatures = 0;
    const char *stamp;

    (void)state;
    if (system("command -v openssl >/dev/null") != 0) {
        print_message("skipped: openssl is not installed\n");
        skip();
    }
    small_log_begin(&l, storage, sizeof storage);
    small_log_open(&l, 0, "");
    small_log_fill(&l, 4);
    small_log_close(&l);
    put_key(l.key);
    for (unsigned k = 0; find_stamp(l.t.buf, k, &line, &stamp); k++) {
        const char *sig = strstr(stamp, "\"sig\":\""), *hash = strstr(stamp, "\"hash\":\"");
        char text[256], out[256];
        long long n;

        if (sig == NULL || sig > strchr(stamp, '\n'))
            continue;
        assert_int_equal(sscanf(stamp, "{\"n\":%lld", &n), 1);
        snprintf(text, sizeof text, "stillmark stamp 1 bench-2 412 %lld %.64s", n, hash + 8);
        put_file("statement", text, strlen(text));
        put_hex("sig", sig + 7, 64);
        first_line(
            "openssl pkeyutl -verify -pubin -inkey key -rawin -in statement -sigfile sig 2>&1",
            out);
        if (strncmp(out, "Signature Verified Successfully", 31) != 0)
            fail_msg("stamp %lld: openssl says %s", n, out);
        signatures++;
    }
    assert_int_equal(signatures, 2);
    small_log_end(&l);
}

static void a_fingerprint_is_that_of_the_raw_key(void **state)
{
    char hex[17];

    (void)state;
    /* of 32 zero bytes: sha256sum of `head -c 32 /dev/zero` */
    assert_int_equal(
        sm_key_fingerprint("0000000000000000000000000000000000000000000000000000000000000000", hex),
        SM_OK);
    assert_string_equal(hex, "66687aadf862bd77");
    assert_int_equal(sm_key_fingerprint("00", hex), SM_ESYNTAX);
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(sha256_gives_the_published_values),
        cmocka_unit_test(ed25519_gives_the_published_values),
        cmocka_unit_test(a_signature_holds_for_its_own_statement_alone),
        cmocka_unit_test_setup_teardown(every_stamp_checks_with_sed_and_sha256sum, make_folder,
                                        drop_folder),
        cmocka_unit_test_setup_teardown(signatures_check_with_openssl, make_folder, drop_folder),
        cmocka_unit_test(a_fingerprint_is_that_of_the_raw_key),
    };

    return cmocka_run_group_tests(tests, NULL, NULL);
}
