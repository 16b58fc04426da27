#ifndef TG_NEAR_H
#define TG_NEAR_H
#include <check.h>
#include <math.h>
#include <stdio.h>
#include <stdlib.h>

/** |got - want| <= atol + rtol |want|; NaN fails. `what` names the source of the expected value.
 *  TG_FIGURES=1 in the environment prints every comparison: the figures behind the word "passed". */
#define CK_NEAR(got, want, rtol, atol, what) \
    do { \
        const double g_ = (double)(got), w_ = (double)(want), t_ = (double)(atol) + (double)(rtol)*fabs(w_); \
        if (getenv("TG_FIGURES")) \
            printf("%s:%d: %s: got %.7g, want %.7g, off by %.2g, allowed %.2g\n", __FILE__, __LINE__, (what), g_, w_, \
                   g_ - w_, t_); \
        ck_assert_msg(fabs(g_ - w_) <= t_, "%s: got %.12g want %.12g, off by %.3g, allowed %.3g", (what), g_, w_, \
                      g_ - w_, t_); \
    } while (0)

/** The call succeeds; else its first message is shown. Uses a tg_error called e. */
#define CK_OK(call) \
    do { \
        const tg_code c_ = (call); \
        ck_assert_msg(c_ == TG_OK, "%s answers %d: %s:%d: %s", #call, (int)c_, e.message[0].file, e.message[0].line, \
                      e.message[0].what); \
    } while (0)

/** A suite of one case. */
#define SUITE_BEGIN(name, seconds) \
    Suite *suite = suite_create(name); \
    TCase *tcase = tcase_create(name); \
    tcase_set_timeout(tcase, seconds); \
    suite_add_tcase(suite, tcase)

#endif
