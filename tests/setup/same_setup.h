/* SPDX-License-Identifier: GPL-3.0-or-later */
/* same_setup.h: two setups are the same in all that the core and the log see. */
#ifndef SM_TEST_SAME_SETUP_H
#define SM_TEST_SAME_SETUP_H
#include "check.h"
#include "setup/setup.h"

/* Field by field where a struct has pointers into the setup. */
static void assert_same_setup(const struct sm_setup *a, const struct sm_setup *b)
{
    assert_string_equal(a->file, b->file);
    assert_string_equal(a->logs, b->logs);
    assert_string_equal(a->state, b->state);
    assert_string_equal(a->socket, b->socket);
    assert_int_equal(a->n_people, b->n_people);
    assert_memory_equal(a->people, b->people, sizeof a->people);
    assert_int_equal(a->n_meters, b->n_meters);
    for (size_t i = 0; i < a->n_meters; i++) {
        const struct sm_core_setup *x = &a->meter[i].core, *y = &b->meter[i].core;

        assert_memory_equal(&a->meter[i].port, &b->meter[i].port, sizeof a->meter[i].port);
        assert_string_equal(x->meter, y->meter);
        assert_string_equal(x->sensor, y->sensor);
        assert_int_equal(x->silence_ns, y->silence_ns);
        assert_int_equal(x->profile - a->profile, y->profile - b->profile);
        assert_int_equal(x->own_method, y->own_method);
        assert_int_equal(x->n_methods, y->n_methods);
        assert_int_equal(x->n_people, y->n_people);
    }
    assert_int_equal(a->n_profiles, b->n_profiles);
    assert_memory_equal(a->profile, b->profile, sizeof a->profile);
    assert_int_equal(a->n_methods, b->n_methods);
    assert_memory_equal(a->method, b->method, sizeof a->method);
    assert_memory_equal(&a->standards, &b->standards, sizeof a->standards);
    assert_int_equal(a->n_files, b->n_files);
    for (size_t i = 0; i < a->n_files; i++) {
        assert_string_equal(a->files[i].name, b->files[i].name);
        assert_int_equal(a->files[i].n, b->files[i].n);
        assert_memory_equal(a->files[i].text, b->files[i].text, a->files[i].n);
    }
}
#endif
