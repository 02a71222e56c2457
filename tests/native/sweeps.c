/* Every network of the corpus with one thing wrong, one after the other. */
#include <inttypes.h>
#include <math.h>
#include <stdio.h>
#include <stdlib.h>

#include "fuzz.h"

/* Linked with --wrap: allocations of the kernel fail where they are told to. */
void *__real_malloc(size_t size);
void *__real_calloc(size_t count, size_t size);
static int64_t fails_at = -1; /* how many allocations succeed before one fails; below 0: none fails */

static int fails(void) { return fails_at >= 0 && fails_at-- == 0; }

void *__wrap_malloc(size_t size) { return fails() ? NULL : __real_malloc(size); }
void *__wrap_calloc(size_t count, size_t size) { return fails() ? NULL : __real_calloc(count, size); }

static int have_again(mt_again *a)
{
    mt_again_free(a);
    return a ? MT_DONE : MT_NO_MEMORY;
}

/* A call with each of its allocations failing in turn has to say so; returns how many it makes. */
static int without_memory(const mt_network *w, sizes z, int which)
{
    severity = 0.0;
    for (int k = 0; k < 100; k++) {
        const double *feed = numbers(z.species, -3, 2), *p = numbers(z.parameters, -3, 3), *T = temperatures(1);
        double *x = keep_block(z.species * (z.species + 2 + z.parameters) + z.terms + 1, sizeof *x), y[4];
        uint8_t *u = keep_block(z.species + 1, 1), b[2];
        int32_t i[3];
        mt_tanks tanks = {1, MT_FROM_FEED, feed, T, T, p, NULL, NULL, NULL, x, i, b, b + 1, u, y, y + 1, y + 2,
                          x + z.species, i + 1, i + 2};
        mt_tubes tubes = {1, 1, feed, T, T, p, x, i, x + z.species, i + 1, i + 2};
        mt_slopes slopes = {1, feed, T, T, p, feed, x, i};
        mt_rates rates = {1, 0, feed, T, p, x, NULL, NULL, NULL};
        fails_at = k;
        int code = which == 0   ? mt_solve_tanks(w, &tanks)
                   : which == 1 ? mt_solve_tubes(w, &tubes)
                   : which == 2 ? mt_tank_slopes(w, &slopes)
                   : which == 3 ? mt_tube_slopes(w, &slopes)
                   : which == 4 ? mt_evaluate(w, &rates)
                   : which == 5 ? mt_step(w, 0, feed, 300.0, p, feed, 1.0, x, x + z.species)
                                : have_again(which == 6 ? mt_tank_again(w, &tanks) : mt_tube_again(w, &tubes));
        int spared = fails_at >= 0;
        fails_at = -1;
        forget_blocks();
        if (spared)
            return k;
        check(code == MT_NO_MEMORY, "out of memory was not told");
    }
    return 0;
}

/* Three hundred points, closer than the steps of a tube of the first species alone: where a long step damps a fast
 * transient the points are reached by steps of their own. */
static void profile(const mt_network *w, sizes z)
{
    severity = 0.0;
    mt_tubes t = {.n = 1, .m = 300};
    double *feed = keep_block(z.species, sizeof *feed);
    for (int64_t i = 0; i < z.species; i++)
        feed[i] = i ? 0.0 : 30.786;
    t.feed = sealed(feed);
    double *asked = keep_block(t.m, sizeof *asked);
    for (int64_t k = 0; k < t.m; k++)
        asked[k] = 3.78e-9 * pow(10.0, 6.0 * (double)k / (double)(t.m - 1));
    t.asked = sealed(asked);
    t.T = temperatures(1), t.p = numbers(z.parameters, -1, 1);
    check_tubes(w, t, z);
    drop_blocks();
}

/* A hundred thousand parameters that nothing reads: their derivatives ask for more than a machine has. */
static void ask_too_much(const packed *p)
{
    packed large = copy_of(p);
    large.ints[6] = 100000;
    sizes z = sizes_of(&large);
    mt_network *w = mt_network_new(large.ints, large.n_ints, large.reals, large.n_reals);
    if (w) { /* else it has instructions, whose registers are others now */
        mt_slopes s = {.n = 1};
        s.feed = s.outlet = numbers(z.species, -3, 2), s.tau = s.T = temperatures(1), s.p = numbers(z.parameters, 0, 1);
        s.slope = keep_block(z.species * (z.species + 2 + z.parameters), sizeof(double));
        s.status = keep_block(1, sizeof(int32_t));
        check(mt_tube_slopes(w, &s) == MT_NO_MEMORY && mt_tank_slopes(w, &s) == MT_NO_MEMORY, "too much was taken");
        forget_blocks();
    }
    free_packed(&large);
    mt_network_free(w);
}

static int64_t starve(const packed *p)
{
    mt_network *w = NULL;
    int64_t failed = 0;
    for (int64_t k = 0; !w; k++) {
        fails_at = k;
        w = mt_network_new(p->ints, p->n_ints, p->reals, p->n_reals);
        check((w != NULL) == (fails_at >= 0), "out of memory was not told");
        failed += !w;
    }
    fails_at = -1;
    profile(w, sizes_of(p));
    for (int which = 0; which < 8; which++)
        failed += without_memory(w, sizes_of(p), which);
    mt_network_free(w);
    return failed;
}

/* Sound networks with one thing wrong, one after the other: each has to be refused. */
void sweep(void)
{
    static const int32_t WRONG[] = {-1, INT32_MAX, INT32_MIN};
    int64_t tried = 0, starved = 0;
    for (const packed *p = corpus; p < corpus + n_corpus; p++) {
        number = p - corpus;
        starved += starve(p);
        ask_too_much(p);
        for (int64_t k = 0; k <= p->n_ints + p->n_reals + 1; k++, tried++) { /* too short by k, or too long by one */
            int64_t ints = k < p->n_ints ? k : p->n_ints, reals = k < p->n_ints ? p->n_reals : k - p->n_ints;
            if (reals == p->n_reals && ints == p->n_ints)
                continue;
            packed whole = splice(p, p->n_ints, p->n_reals, p, p->n_ints - 1, 0); /* so that too long can be read */
            packed damaged = splice(&whole, ints, reals, p, p->n_ints, p->n_reals);
            check(!mt_network_new(damaged.ints, ints, damaged.reals, reals), "a network of another length was taken");
            free_packed(&damaged);
            free_packed(&whole);
        }
        for (int64_t k = 0; k < p->n_ints; k++)
            for (int j = 0; j < 3; j++, tried++) {
                packed damaged = copy_of(p);
                damaged.ints[k] = WRONG[j];
                check(!mt_network_new(damaged.ints, p->n_ints, damaged.reals, p->n_reals), "a wrong int was taken");
                free_packed(&damaged);
            }
    }
    printf("refused, one by one: %" PRId64 ", for want of memory: %" PRId64 "\n", tried, starved);
}

