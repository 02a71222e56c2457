/* Stirred tanks: from feeds to checked outlets, a case at a time. */
#include <stdlib.h>
#include <string.h>

#include "kernel.h"

#define NOTHING 1e-200 /* of the largest concentration: the root of the root of the root of it is still little */
#define STEADY_DEPTH 1e-60
#define DEPTH 1e-30
#define ZERO_ORDER 1e-9
#define LOW 1e6
#define RELIABLE 1e-10 /* beyond which more digits are called for */
#define BELIEVED 1e-8  /* estimated relative error beyond which an answer is withheld */
#define CLOSED 1e-12   /* residual over the sum of a balance's terms */
#define INVARIANT 1e-9 /* of the sum of a total's terms */

#define BRIEFEST 1e-50 /* s: no residence time above it is brief */
#define BRIEF 1e-100   /* of the feed: a conversion that is exact to first order */

static const double FIRST_GUESSES[2] = {1e-3, 1e-9}; /* of the largest concentration */

/* One case on a desk. */
typedef struct {
    desk *d;
    const mt_tanks *all;
    int64_t row;
    tank t;
    double scale;
    double *feed, *start, *c, *f;
    uint8_t *fed, *gone;
    int bound; /* T and p of `row` are in the registers */
    outcome out;
    double residual, condition, error;
} job;

/* Depths of both cuts from the largest concentration. */
static void set_depths(desk *d, double scale)
{
    const network *w = d->net;
    for (int k = 0; k < w->steady.n; k++)
        d->depth_steady[k] = w->steady.share[k] * scale;
    for (int k = 0; k < w->moving.n; k++)
        d->depth_moving[k] = w->moving.share[k] * scale;
}

static void open_job(job *j, desk *d, const mt_tanks *all)
{
    int S = d->net->species;
    j->d = d, j->all = all, j->bound = 0, j->row = 0;
    j->feed = take(d, S), j->start = take(d, S), j->c = take(d, S), j->f = take(d, S);
    j->fed = (uint8_t *)take(d, S);
    j->gone = (uint8_t *)take(d, S);
}

/* Cases that differ in feed and residence time alone share what T and p make. */
static int same_constants(const network *w, const mt_tanks *a, int64_t row, int64_t other)
{
    size_t P = (size_t)w->laws.parameters;
    return !memcmp(a->T + row, a->T + other, sizeof *a->T) &&
           (!P || !memcmp(a->p + row * (int64_t)P, a->p + other * (int64_t)P, P * sizeof *a->p));
}

static void load(job *j, int64_t row)
{
    desk *d = j->d;
    const network *w = d->net;
    const mt_tanks *a = j->all;
    const double *feed = a->feed + row * w->all, *start = a->start ? a->start + row * w->all : feed;
    double largest = 0.0;
    for (int i = 0; i < w->all; i++)
        largest = fmax(largest, fmax(feed[i], start[i]));
    for (int i = 0; i < w->species; i++) {
        int at = w->present[i];
        j->feed[i] = feed[at], j->start[i] = start[at];
        j->fed[i] = a->fed ? a->fed[row * w->all + at] : 1;
        j->gone[i] = 0;
        if (a->how != MT_FROM_FEED)
            j->c[i] = a->c[row * w->all + at];
    }
    j->scale = a->scale ? a->scale[row] : largest > 0 ? largest : NOWHERE;
    set_depths(d, j->scale);
    if (!j->bound || !same_constants(w, a, j->row, row))
        bind_case(&w->laws, d->registers, a->T[row], w->laws.parameters ? a->p + row * w->laws.parameters : NULL);
    j->bound = 1, j->row = row;
    j->t = (tank){{&w->steady, d->depth_steady}, j->feed, a->tau[row], NOTHING * j->scale};
    j->out = (outcome){MT_OK, 0, 0, 0};
    j->residual = j->condition = j->error = 0.0;
    d->work = 0;
}

/* Species that laws of order zero use up: so low that those laws are cut and take most of it, or below the
 * rounding of what they take. */
static int mark_gone(job *j, const double *c, uint8_t *gone)
{
    desk *d = j->d;
    const network *w = d->net;
    const cut *s = &w->steady;
    int any = 0;
    for (int i = 0; i < w->species; i++)
        gone[i] = 0;
    if (!s->n)
        return 0;
    law_rates(d, j->t.laws, c, d->r);
    for (int k = 0; k < s->n; k++) {
        int i = s->species[k];
        double taken = 0.0, other = 0.0;
        for (int m = 0; m < w->laws.terms; m++) {
            int n = w->owner[m];
            for (int e = w->gain_start[n]; e < w->gain_start[n + 1]; e++) {
                double takes = -w->sign[m] * w->gain[e];
                if (w->gain_species[e] != i || !(takes > 0))
                    continue;
                double amount = j->t.tau * d->r[m] * takes;
                if (fabs(w->order[(ptrdiff_t)m * w->species + i]) < ZERO_ORDER)
                    taken += amount;
                else
                    other += amount;
            }
        }
        int below = c[i] < LOW * j->t.laws.depth[k] && taken >= other;
        gone[i] = below || c[i] + other < 4.0 * EPSILON * taken;
        any |= gone[i];
    }
    return any;
}

/* A steady state into c: by Newton's method where there is but one, by the start-up else. */
static void find_state(job *j)
{
    desk *d = j->d;
    const network *w = d->net;
    int S = w->species;
    for (int g = 0; w->unique && g < 2; g++) {
        int steps = 0;
        for (int i = 0; i < S; i++)
            j->c[i] = fmax(j->feed[i], FIRST_GUESSES[g] * j->scale);
        int settled = newton(d, &j->t, j->c, 60, &steps);
        j->out.iterations += steps;
        if (settled)
            return;
    }
    j->all->from_start[j->row] = 1;
    int all = 1;
    for (int i = 0; i < S; i++)
        all &= j->fed[i];
    start_up(d, &j->t, j->start, all ? NULL : j->fed, j->scale, j->c, &j->out);
}

static int totals_lost(const job *j, const double *c)
{
    const network *w = j->d->net;
    for (int k = 0; k < w->n_totals; k++) {
        double off = 0.0, terms = 0.0;
        for (int i = 0; i < w->species; i++) {
            double weight = w->totals[(ptrdiff_t)k * w->species + i];
            off += weight * (c[i] - j->feed[i]);
            terms += fabs(weight) * (fabs(c[i]) + j->feed[i]);
        }
        if (fabs(off) > INVARIANT * terms)
            return 1;
    }
    return 0;
}

/* How right a root is, and what a disturbance does there: MT_OK, MT_UNSTABLE or MT_OSCILLATES. */
static int judge(job *j)
{
    desk *d = j->d;
    int unstable, known = 0;
    double rate, swing, unused, *c = j->c;
    if (j->all->how == MT_CHECK_ONLY) {
        memcpy(j->f, c, (size_t)d->net->species * sizeof *c);
        polish(d, &j->t, j->f, j->gone, &j->residual, &j->condition, &unused);
    } else {
        mark_gone(j, c, j->gone);
        if (!j->all->condition && vouch(d, &j->t, c, j->gone, &j->residual, &j->error))
            return MT_OK;
        known = polish(d, &j->t, c, j->gone, &j->residual, &j->condition, &j->error);
    }
    growth(d, &j->t, c, known, &rate, &swing, &unstable);
    return !unstable ? MT_OK : swing > 0 ? MT_OSCILLATES : MT_UNSTABLE;
}

/* Polishes a root and checks it: the last check that fails is the status, as in the reference engine. */
static void settle(job *j)
{
    desk *d = j->d;
    const network *w = d->net;
    int S = w->species, status = MT_OK;
    double *c = j->c;
    int moves = judge(j);
    for (int i = 0; i < S; i++)
        j->all->root[j->row * w->all + w->present[i]] = c[i];
    if (!(j->error <= BELIEVED))
        status = MT_ILL_CONDITIONED;
    if (!(j->residual <= CLOSED))
        status = MT_RESIDUAL;
    if (moves != MT_OK)
        status = moves;
    if (!w->unique && j->all->how != MT_FROM_GUESS &&
        invaded(d, j->all->T[j->row], w->laws.parameters ? j->all->p + j->row * w->laws.parameters : NULL, c, j->t.tau))
        status = MT_UNSTABLE;
    mark_gone(j, c, j->gone);
    int negative = 0;
    for (int i = 0; i < S; i++) {
        if (j->gone[i] || c[i] <= j->t.nothing)
            c[i] = 0.0;
        negative |= !(c[i] >= 0);
    }
    if (!laws_defined(d, j->t.laws, c))
        status = MT_NOT_FINITE;
    if (negative)
        status = MT_NEGATIVE;
    if (totals_lost(j, c))
        status = MT_INVARIANT;
    j->out.status = status;
}

/* Numbers that are none may come in where no law looks at them; they don't go out as an answer. */
static int is_answer(const job *j)
{
    if (j->out.status != MT_OK || j->out.faded)
        return 0;
    for (int i = 0; i < j->d->net->species; i++)
        if (!isfinite(j->c[i]))
            return 0;
    return 1;
}

static void store(job *j)
{
    const network *w = j->d->net;
    const mt_tanks *a = j->all;
    int64_t row = j->row;
    int fine = is_answer(j);
    if (!fine && !j->out.faded && j->out.status == MT_OK)
        j->out.status = MT_NOT_FINITE;
    double *c = a->c + row * w->all;
    uint8_t *used = a->exhausted + row * w->all;
    for (int i = 0; i < w->all; i++) {
        c[i] = fine ? 0.0 : NAN;
        used[i] = w->wanted[i];
    }
    for (int i = 0; i < w->species; i++) {
        if (fine)
            c[w->present[i]] = j->c[i];
        used[w->present[i]] |= j->gone[i];
    }
    a->status[row] = j->out.status;
    a->faded[row] = (uint8_t)j->out.faded;
    a->residual[row] = j->residual, a->error[row] = j->error;
    if (a->condition)
        a->condition[row] = j->condition;
    a->iterations[row] = j->out.iterations;
    a->work[row] = (int32_t)(j->d->work < INT32_MAX ? j->d->work : INT32_MAX);
}

/* Answers a tank of so short a residence time that products of products would underflow. */
static int hardly_changes(job *j)
{
    desk *d = j->d;
    const network *w = d->net;
    laws l = {&w->moving, d->depth_moving};
    double largest = 0.0;
    if (!(j->t.tau < BRIEFEST))
        return 0;
    for (int i = 0; i < w->species; i++)
        largest = fmax(largest, j->feed[i]);
    law_rates(d, l, j->feed, d->r);
    for (int t = 0; t < w->laws.terms; t++) {
        d->r[t] *= j->t.tau;
        if (!(fabs(d->r[t]) < BRIEF * largest))
            return 0;
    }
    gains(d, d->r, j->c);
    for (int i = 0; i < w->species; i++)
        j->c[i] += j->feed[i];
    j->condition = 1.0;
    return 1;
}

static void solve_one(job *j, int64_t row)
{
    const network *w = j->d->net;
    int S = w->species;
    load(j, row);
    j->all->from_start[row] = 0;
    for (int i = 0; i < w->all; i++)
        j->all->root[row * w->all + i] = 0.0;
    if (!w->laws.terms) {
        memcpy(j->c, j->feed, (size_t)S * sizeof *j->c);
        j->condition = 1.0;
        if (!w->unique && invaded(j->d, j->all->T[row],
                                  w->laws.parameters ? j->all->p + row * w->laws.parameters : NULL, j->c, j->t.tau))
            j->out.status = MT_UNSTABLE;
        store(j);
        return;
    }
    if (j->all->how == MT_FROM_FEED && hardly_changes(j)) {
        store(j);
        return;
    }
    if (j->all->how == MT_FROM_FEED)
        find_state(j);
    else if (j->all->how == MT_FROM_GUESS) {
        int steps = 0;
        for (int i = 0; i < S; i++)
            j->c[i] = fmax(j->c[i], j->t.nothing);
        if (!newton(j->d, &j->t, j->c, 60, &steps))
            j->out.status = MT_NOT_CONVERGED;
        j->out.iterations = steps;
    }
    if (j->out.status == MT_OK && !j->out.faded)
        settle(j);
    store(j);
}

static int is_complete(const network *w, const mt_tanks *a)
{
    return a->how >= MT_FROM_FEED && a->how <= MT_CHECK_ONLY && a->feed && a->tau && a->T && (a->p || !w->laws.parameters) &&
           a->c && a->status && a->from_start && a->faded && a->exhausted && a->residual && a->error &&
           a->root && a->iterations && a->work;
}

static int needs_second_look(const job *j)
{
    int used_up = 0;
    for (int i = 0; i < j->d->net->species; i++)
        used_up |= j->gone[i];
    return j->out.status != MT_OK || j->out.faded || used_up || !(j->error <= RELIABLE);
}

int mt_solve_tanks(const mt_network *w, const mt_tanks *all)
{
    desk d;
    job j;
    if (!w || !all || all->n < 0 || !is_complete(w, all))
        return MT_BAD_REQUEST;
    if (!desk_open(&d, w, 0))
        return MT_NO_MEMORY;
    open_job(&j, &d, all);
    int doubtful = 0;
    for (int64_t row = 0; row < all->n; row++) {
        solve_one(&j, row);
        doubtful += needs_second_look(&j) && doubtful < INT32_MAX;
    }
    desk_close(&d);
    return doubtful;
}

typedef struct {
    desk d;
    job j;
    mt_tanks all;
} seat;

static int again(void *self)
{
    seat *s = self;
    solve_one(&s->j, 0);
    return needs_second_look(&s->j);
}

static void leave(void *self)
{
    seat *s = self;
    desk_close(&s->d);
    free(s);
}

mt_again *mt_tank_again(const mt_network *w, const mt_tanks *one)
{
    if (!w || !one || one->n != 1 || !is_complete(w, one))
        return NULL;
    seat *s = calloc(1, sizeof *s);
    if (!s)
        return NULL;
    s->all = *one;
    if (!desk_open(&s->d, w, 0)) {
        leave(s);
        return NULL;
    }
    open_job(&s->j, &s->d, &s->all);
    return keep_vessel(w, s, (vessel){again, leave, one->feed, one->T, one->p});
}
