/* SPDX-License-Identifier: GPL-3.0-or-later */
/* slow.h: a build with sanitizers runs ten times as long; long tests then try a part. */
#ifndef SM_TESTS_SLOW_H
#define SM_TESTS_SLOW_H
#if defined(__has_feature)
#if __has_feature(address_sanitizer)
#define SLOW_BUILD 1
#endif
#endif
#if defined(__SANITIZE_ADDRESS__)
#define SLOW_BUILD 1
#endif
#ifndef SLOW_BUILD
#define SLOW_BUILD 0
#endif
#endif
