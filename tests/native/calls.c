/* The calls: random numbers in, and what has to hold of all that comes out. */
#include <math.h>
#include <stdlib.h>
#include <string.h>

#include "fuzz.h"

/* What one case may cost at most, in evaluations of all laws: what the kernel's allowances add up to.
 * Tank: 1500 steps of 13, 375 looks of 32, 20,000 iterations of creep.c, and some 300 before and after.
 * Tube: 12,000 steps of 17 along the mesh, as many of 12 between mesh points, and 17 for each point. */
#define MOST_TANK_WORK 52000
#define MOST_TUBE_WORK 350000
#define MOST_TUBE_STEPS 12000

const char *const CALL_NAMES[CALLS] = {"tanks", "tanks, short of one thing", "tubes", "tank slopes", "tube slopes",
                                       "rates", "rates and derivatives", "again", "steps"};

static void note_status(int64_t status)
{
    check(status >= 0 && status <= LAST_STATUS, "a status that there is not");
    seen.ended[status]++;
}

static void note_most(int64_t *most, int64_t *worst, int64_t now)
{
    if (now > *most)
        *most = now, *worst = number;
}

static void check_finite(const double *x, int64_t count, const char *what)
{
    for (int64_t k = 0; k < count; k++)
        check(isfinite(x[k]) != 0, what);
}

/* Requests of n tanks with room for their answers. */
static mt_tanks new_tanks(sizes z, int64_t n)
{
    int64_t all = n * z.species;
    mt_tanks t = {.n = n, .how = below(3)};
    t.feed = numbers(all, -3, 2), t.tau = numbers(n, -4, 6), t.T = temperatures(n);
    t.p = numbers(n * z.parameters, -3, 3);
    t.start = below(2) ? numbers(all, -3, 2) : NULL;
    if (below(2)) {
        uint8_t *fed = keep_block(all, 1);
        for (int64_t k = 0; k < all; k++)
            fed[k] = (uint8_t)below(2);
        t.fed = sealed(fed);
    }
    t.scale = below(3) ? NULL : numbers(n, -1, 1);
    t.c = keep_block(all, sizeof(double));
    for (int64_t k = 0; k < all; k++)
        t.c[k] = any(-3, 2);
    t.status = keep_block(n, sizeof(int32_t));
    t.from_start = keep_block(n, 1), t.faded = keep_block(n, 1), t.exhausted = keep_block(all, 1);
    t.residual = keep_block(n, sizeof(double)), t.condition = keep_block(n, sizeof(double));
    t.error = keep_block(n, sizeof(double)), t.root = keep_block(all, sizeof(double));
    t.iterations = keep_block(n, sizeof(int32_t)), t.work = keep_block(n, sizeof(int32_t));
    return t;
}

static void check_tanks(int code, mt_tanks t, sizes z)
{
    check(code >= 0 && code <= t.n, "tanks: a return code that there is not");
    for (int64_t k = 0; k < t.n; k++) {
        note_status(t.status[k]);
        check(t.from_start[k] <= 1 && t.faded[k] <= 1, "tanks: a flag that is none");
        if (t.status[k] == MT_OK && !t.faded[k])
            check_finite(t.c + k * z.species, z.species, "tanks: a fine outlet is not finite");
        check(t.work[k] >= 0 && t.work[k] <= MOST_TANK_WORK, "tanks: more work than allowed");
        note_most(&seen.tank_work, &seen.worst_tank, t.work[k]);
        seen.iterations = t.iterations[k] > seen.iterations ? t.iterations[k] : seen.iterations;
    }
}

static void solve_tanks(const mt_network *w, sizes z)
{
    mt_tanks t = new_tanks(z, below(4));
    check_tanks(mt_solve_tanks(w, &t), t, z);
}

static uint64_t answers_of(mt_tanks t, sizes z)
{
    size_t all = (size_t)z.species;
    uint64_t h = digest(1, t.c, all * sizeof *t.c);
    h = digest(digest(h, t.root, all * sizeof *t.root), t.exhausted, all);
    h = digest(digest(h, t.residual, sizeof *t.residual), t.condition, sizeof *t.condition);
    h = digest(digest(h, t.error, sizeof *t.error), t.status, sizeof *t.status);
    h = digest(digest(h, t.from_start, 1), t.faded, 1);
    return digest(digest(h, t.iterations, sizeof *t.iterations), t.work, sizeof *t.work);
}

/* The last of a batch, alone and again: the same to the last bit, whatever was solved on that desk before. */
static void tank_again(const mt_network *w, sizes z)
{
    int64_t n = 1 + below(3), all = z.species;
    mt_tanks t = new_tanks(z, n), one = new_tanks(z, 1);
    ptrdiff_t last = n - 1, there = last * all;
    memcpy(one.c, t.c + there, (size_t)all * sizeof *one.c);
    one.how = t.how, one.feed = t.feed + there, one.tau = t.tau + last, one.p = t.p + last * z.parameters;
    one.start = t.start ? t.start + there : NULL, one.fed = t.fed ? t.fed + there : NULL;
    one.scale = t.scale ? t.scale + last : NULL;
    double T = t.T[last], *first = keep_block(all, sizeof *first);
    memcpy(first, one.c, (size_t)all * sizeof *first);
    one.T = &T;
    check_tanks(mt_solve_tanks(w, &t), t, z);
    mt_tanks in_batch = t;
    in_batch.c += there, in_batch.root += there, in_batch.exhausted += there, in_batch.residual += last;
    in_batch.condition += last, in_batch.error += last, in_batch.status += last, in_batch.from_start += last;
    in_batch.faded += last, in_batch.iterations += last, in_batch.work += last;
    mt_again *a = mt_tank_again(w, &one);
    check(a != NULL, "again: a sound request was refused");
    for (int k = 0; k < 2; k++) {
        memcpy(one.c, first, (size_t)all * sizeof *first);
        check_tanks(mt_again_solve(a), one, z);
        check(answers_of(one, z) == answers_of(in_batch, z), "again: another answer than in a batch");
    }
    T = T == 300.0 ? 301.0 : 300.0;
    check(mt_again_solve(a) == MT_CHANGED, "again: another temperature was not seen");
    mt_again_free(a);
    t.how = below(2) ? 3 : -1;
    check(mt_solve_tanks(w, &t) == MT_BAD_REQUEST && !mt_tank_again(w, &t), "tanks: an unknown way was taken");
}

static void refuse(const mt_network *w)
{
    mt_tanks t = {.n = below(2) ? -1 : 1, .how = MT_FROM_FEED};
    mt_tubes u = {.n = 1, .m = -1};
    mt_slopes s = {.n = 1};
    mt_rates r = {.n = -1};
    check(mt_again_solve(NULL) == MT_BAD_REQUEST, "again: nothing was taken");
    mt_again_free(NULL);
    check(!mt_tank_again(w, &t) && !mt_tube_again(w, &u), "again: a bad request was taken");
    check(mt_solve_tanks(w, &t) == MT_BAD_REQUEST && mt_solve_tanks(NULL, &t) == MT_BAD_REQUEST &&
              mt_solve_tanks(w, NULL) == MT_BAD_REQUEST,
          "tanks: a bad request was taken");
    check(mt_solve_tubes(w, &u) == MT_BAD_REQUEST, "tubes: a bad request was taken");
    check(mt_tank_slopes(w, &s) == MT_BAD_REQUEST, "slopes: a bad request was taken");
    check(mt_evaluate(w, &r) == MT_BAD_REQUEST, "rates: a bad request was taken");
    check(!mt_network_new(NULL, 1, NULL, 1) && !mt_network_new((const int32_t[]){0}, -1, (const double[]){0}, 0),
          "a network of nothing");
    mt_network_free(NULL);
}

mt_tubes check_tubes(const mt_network *w, mt_tubes t, sizes z)
{
    int64_t points = t.n * t.m;
    t.c = keep_block(points * z.species, sizeof(double)), t.status = keep_block(points, sizeof(int32_t));
    t.exhausted_at = keep_block(t.n * z.species, sizeof(double));
    t.steps = keep_block(t.n, sizeof(int32_t)), t.work = keep_block(t.n, sizeof(int32_t));
    check(mt_solve_tubes(w, &t) == MT_DONE, "tubes: a return code that there is not");
    for (int64_t k = 0; k < points; k++) {
        note_status(t.status[k]);
        if (t.status[k] == MT_OK)
            check_finite(t.c + k * z.species, z.species, "tubes: a fine state is not finite");
    }
    for (int64_t k = 0; k < t.n; k++) {
        check(t.steps[k] >= 0 && t.steps[k] <= MOST_TUBE_STEPS, "tubes: more steps than allowed");
        check(t.work[k] >= 0 && t.work[k] <= MOST_TUBE_WORK, "tubes: more work than allowed");
        note_most(&seen.tube_work, &seen.worst_tube, t.work[k]);
        seen.steps = t.steps[k] > seen.steps ? t.steps[k] : seen.steps;
    }
    return t;
}

/* A tube alone, twice: the same to the last bit. */
static void tube_again(const mt_network *w, sizes z)
{
    mt_tubes t = {.n = 1, .m = below(4)};
    t.feed = numbers(z.species, -3, 2), t.asked = numbers(t.m, -6, 4), t.T = temperatures(1);
    t.p = numbers(z.parameters, -3, 3);
    size_t size = (size_t)(t.m * z.species) * sizeof(double);
    t = check_tubes(w, t, z);
    uint64_t before = digest(digest(1, t.c, size), t.status, (size_t)t.m * sizeof *t.status);
    mt_again *a = mt_tube_again(w, &t);
    check(a != NULL, "again: a sound request was refused");
    for (int k = 0; k < 2; k++) {
        check(mt_again_solve(a) == MT_DONE, "again: a return code that there is not");
        check(digest(digest(1, t.c, size), t.status, (size_t)t.m * sizeof *t.status) == before,
              "again: another answer than before");
    }
    mt_again_free(a);
}

static void solve_tubes(const mt_network *w, sizes z)
{
    int64_t n = below(3), m = below(4) ? below(4) : 12;
    mt_tubes t = {.n = n, .m = m};
    t.feed = numbers(n * z.species, -3, 2), t.asked = numbers(n * m, -6, 4), t.T = temperatures(n);
    t.p = numbers(n * z.parameters, -3, 3);
    check_tubes(w, t, z);
}

static void find_slopes(const mt_network *w, sizes z, int of_tubes)
{
    int64_t n = below(3), all = n * z.species;
    mt_slopes s = {.n = n};
    s.feed = numbers(all, -3, 2), s.tau = numbers(n, -4, of_tubes ? 1 : 6), s.T = temperatures(n);
    s.p = numbers(n * z.parameters, -3, 3);
    s.outlet = of_tubes ? NULL : numbers(all, -3, 2);
    s.slope = keep_block(all * (z.species + 2 + z.parameters), sizeof(double));
    s.status = keep_block(n, sizeof(int32_t));
    int code = of_tubes ? mt_tube_slopes(w, &s) : mt_tank_slopes(w, &s);
    check(code == MT_DONE || code == MT_NO_MEMORY, "slopes: a return code that there is not");
    for (int64_t k = 0; k < n && code == MT_DONE; k++)
        note_status(s.status[k]);
    if (code != MT_DONE) /* nothing was written: nothing to digest */
        memset(s.slope, 0, (size_t)(all * (z.species + 2 + z.parameters)) * sizeof(double)),
            memset(s.status, 0, (size_t)n * sizeof(int32_t));
}

static void find_rates(const mt_network *w, sizes z, int derivatives)
{
    int64_t n = below(4), rates = n * z.terms;
    mt_rates r = {.n = n, .strict = below(2)};
    r.c = numbers(n * z.species, -3, 2), r.T = temperatures(n), r.p = numbers(n * z.parameters, -3, 3);
    r.rate = keep_block(rates, sizeof(double));
    if (derivatives) {
        r.by_c = keep_block(rates * z.species, sizeof(double)), r.by_T = keep_block(rates, sizeof(double));
        r.by_p = keep_block(rates * z.parameters, sizeof(double));
    }
    check(mt_evaluate(w, &r) == MT_DONE, "rates: a return code that there is not");
}

/* `present` is the section after the header: states of mt_step have the species that there are. */
static void make_step(const mt_network *w, sizes z, int64_t present)
{
    const double *feed = numbers(present, -3, 2), *p = numbers(z.parameters, -3, 3), *c = numbers(present, -3, 2);
    double *after = keep_block(present, sizeof *after), *error = keep_block(present, sizeof *error);
    check(mt_step(w, (int)below(2), feed, any(2.3, 3), p, c, any(-6, 2), after, error) == MT_DONE,
          "step: a return code that there is not");
    check(mt_step(w, 2, feed, 300.0, p, c, 1.0, after, error) == MT_BAD_REQUEST, "step: a bad request was taken");
}

void use(const mt_network *w, const packed *p)
{
    sizes z = sizes_of(p);
    int64_t call = below(CALLS);
    seen.called[call]++;
    switch (call) {
    case 0: solve_tanks(w, z); break;
    case 1: refuse(w), solve_tanks(w, z); break;
    case 2: solve_tubes(w, z); break;
    case 3: find_slopes(w, z, 0); break;
    case 4: find_slopes(w, z, 1); break;
    case 5: find_rates(w, z, 0); break;
    case 6: find_rates(w, z, 1); break;
    case 7: below(2) ? tank_again(w, z) : tube_again(w, z); break;
    default: make_step(w, z, p->ints[3]);
    }
    drop_blocks();
}

