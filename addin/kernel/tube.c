/* Plug-flow tubes: dc/dtau = nu' r(c), c(0) = feed, at any number of residence times.
 *
 * A point between two mesh points is reached by one shorter step of the same method from the mesh point
 * before it: a shorter step is a better one, and has the full order of the method, which an interpolating
 * polynomial has not. Where it is not good enough (fast transients that the long step damps), many steps.
 */
#include <stdlib.h>
#include <string.h>

#include "kernel.h"

#define MOST_STEPS 12000 /* of the mesh, and again of all steps between its points */
#define ABSOLUTE 1e-25
#define NOTHING 1e-40  /* shown as zero */
#define VANISHING 1e-5 /* of the feed: where a law of negative order is about to end */
#define INVARIANT 1e-9 /* of the sum of a total's terms */
#define ZERO_ORDER 1e-9
#define SHARE_OF_DEPTH 0.1
#define LOW 1e6
#define SUMMED (16 * EPSILON) /* of the feed: rounding of the steps that a law of order zero takes from it */
#define GENEROUS 4.0 /* misses of a shorter step that are taken */

/* Error of a step, explicit and stiff; the sum of all stays below 1e-8. */
static const double RELATIVE[2] = {1e-10, 1e-8};

typedef struct {
    desk *d;
    const mt_tubes *all;
    int64_t row;
    double scale, endless_from;
    double *feed, *point, *error, *slope, *exhausted;
    flow f;
    tolerance o;
    totals w, none;
    stepper s, inner;
    int waiting; /* points not reached yet */
    int between; /* steps that may still be taken between mesh points */
    int odd;     /* a law takes a root of a negative number right at the inlet */
} run_state;

static void open_run(run_state *u, desk *d, const mt_tubes *all)
{
    int S = d->net->species;
    stepper *both[2] = {&u->s, &u->inner};
    u->d = d, u->all = all;
    u->feed = take(d, S), u->point = take(d, S), u->error = take(d, S), u->slope = take(d, S);
    u->exhausted = take(d, S);
    u->o.least = take(d, S);
    u->w.first = take(d, d->net->n_totals), u->w.last = take(d, d->net->n_totals);
    for (int k = 0; k < 2; k++) {
        both[k]->c = take(d, S), both[k]->before = take(d, S);
        both[k]->after = take(d, S), both[k]->error = take(d, S);
    }
}

static void load(run_state *u, int64_t row)
{
    desk *d = u->d;
    const network *w = d->net;
    const mt_tubes *a = u->all;
    double largest = 0.0, *least = (double *)u->o.least;
    for (int i = 0; i < w->all; i++)
        largest = fmax(largest, a->feed[row * w->all + i]);
    u->row = row;
    u->scale = largest > 0 ? largest : NOWHERE;
    u->endless_from = INFINITY;
    for (int k = 0; k < w->moving.n; k++)
        d->depth_moving[k] = w->moving.share[k] * u->scale;
    for (int i = 0; i < w->species; i++) {
        u->feed[i] = a->feed[row * w->all + w->present[i]];
        u->exhausted[i] = NAN;
        least[i] = ABSOLUTE * u->scale;
    }
    for (int k = 0; k < w->moving.n; k++)
        if (w->ends[w->moving.species[k]])
            least[w->moving.species[k]] = SHARE_OF_DEPTH * d->depth_moving[k];
    bind_case(&w->laws, d->registers, a->T[row], w->laws.parameters ? a->p + row * w->laws.parameters : NULL);
    d->work = 0;
    u->f = (flow){{&w->moving, d->depth_moving}, u->feed, 0.0};
    u->o.relative[0] = RELATIVE[0], u->o.relative[1] = RELATIVE[1], u->o.scale = u->scale;
    totals_of(d, &u->w, u->feed, u->feed, 0.0);
    u->odd = takes_odd_root(d, u->f.cut, u->feed);
    stepper_start(d, &u->s, &u->f, &u->o, &u->w, u->feed, MOST_STEPS, EXPLICIT);
}

/* When species i, just brought to nothing, reached it: c' = -k c^q from the start of the step. */
static double end_of(run_state *u, int i)
{
    const network *w = u->d->net;
    double least = INFINITY;
    for (int t = 0; t < w->laws.terms; t++) {
        int j = w->owner[t];
        for (int k = w->gain_start[j]; k < w->gain_start[j + 1]; k++)
            if (w->gain_species[k] == i && w->sign[t] * w->gain[k] < 0)
                least = fmin(least, w->order[(ptrdiff_t)t * w->species + i]);
    }
    flow_slope(u->d, &u->f, u->s.before, u->slope);
    double left = u->s.before[i] / -u->slope[i] / (1.0 - fmin(least, 0.999));
    if (!isfinite(left) || left < 0)
        left = 0.0;
    return u->s.from + fmin(left, u->s.stride);
}

/* Does a law that runs grow without bound as species i vanishes? */
static int has_no_bound(run_state *u, int i)
{
    desk *d = u->d;
    const network *w = d->net;
    const program *q = &w->laws;
    int any = 0;
    for (int t = 0; t < q->terms; t++)
        any |= w->order[(ptrdiff_t)t * w->species + i] < -ZERO_ORDER;
    if (!any)
        return 0;
    for (int k = 0; k < w->species; k++)
        d->registers[k] = fmax(u->s.c[k], 1e-300);
    run(q, q->prelude, q->prelude + q->body, d->registers, 0);
    for (int t = 0; t < q->terms; t++)
        if (w->order[(ptrdiff_t)t * w->species + i] < -ZERO_ORDER && d->registers[q->output[t]] != 0)
            return 1;
    return 0;
}

static void note_ends(run_state *u)
{
    const network *w = u->d->net;
    for (int k = 0; k < w->moving.n; k++) {
        int i = w->moving.species[k], low = u->s.c[i] < LOW * u->d->depth_moving[k];
        if (!low || !w->ends[i])
            u->exhausted[i] = NAN;
        else if (isnan(u->exhausted[i]))
            u->exhausted[i] = end_of(u, i);
        if (low && u->s.from < u->endless_from && has_no_bound(u, i))
            u->endless_from = u->s.from;
    }
}

/* The state a time h after c, in as many steps as it takes; nan if they are too many, this time or of all points
 * together: a profile of a thousand points has the same allowance as one of ten. */
static void many_steps(run_state *u, const double *c, double h, double *out)
{
    desk *d = u->d;
    stepper *s = &u->inner;
    stepper_start(d, s, &u->f, &u->o, NULL, c, u->between, STIFF);
    s->active = u->between > 0;
    while (s->active && s->t < h) {
        s->h = fmin(s->h, h - s->t);
        attempt(d, s);
        if (h - s->t <= 1e-15 * h)
            break;
    }
    u->between -= s->steps;
    for (int i = 0; i < d->net->species; i++)
        out[i] = s->active ? s->c[i] : NAN;
}

/* The state a time h after the start of the last step, into `point`. */
static void reach(run_state *u, double h)
{
    desk *d = u->d;
    int S = d->net->species, finite, poor;
    const double *c = u->s.before;
    METHODS[u->s.last_mode].step(d, &u->f, c, h, u->o.least, u->point, u->error, NULL);
    poor = !(missed(d, &u->o, &u->f, u->error, c, u->point, u->s.last_mode, &finite) <= GENEROUS) || !finite;
    for (int i = 0; i < S; i++)
        poor |= !(u->point[i] >= -u->o.least[i]);
    if (!poor)
        poor = !(leaked(d, &u->o, &u->f, c, u->point, h) <= GENEROUS);
    if (poor)
        many_steps(u, c, h, u->point);
    restore(d, &u->w, u->point, h);
}

static void store_point(run_state *u, int64_t m)
{
    const network *w = u->d->net;
    double *out = u->all->c + (u->row * u->all->m + m) * w->all;
    for (int i = 0; i < w->species; i++)
        out[w->present[i]] = u->point[i];
}

/* Answers the points that the last step has passed. */
static void cover(run_state *u)
{
    const mt_tubes *a = u->all;
    for (int64_t m = 0; m < a->m; m++) {
        double asked = a->asked[u->row * a->m + m];
        int32_t *status = a->status + u->row * a->m + m;
        if (*status >= 0 || !(asked <= u->s.from + u->s.stride))
            continue;
        reach(u, asked - u->s.from);
        store_point(u, m);
        *status = MT_OK;
        u->waiting--;
    }
}

/* The status of a point that was reached; tidies it up. */
static int check_point(run_state *u, double asked, double *c)
{
    desk *d = u->d;
    const network *w = d->net;
    int S = w->species, negative = 0, finite = 1, lost = 0;
    for (int k = 0; k < w->moving.n; k++) {
        int i = w->moving.species[k];
        int rounding = w->starved[i] && c[i] < SUMMED * u->feed[i];
        if ((c[i] < LOW * d->depth_moving[k] || rounding) && w->ends[i])
            c[i] = 0.0;
    }
    for (int i = 0; i < S; i++) {
        negative |= c[i] < -u->o.least[i];
        if ((c[i] < 0 && c[i] >= -u->o.least[i]) || fabs(c[i]) < NOTHING * u->scale)
            c[i] = 0.0;
        finite &= isfinite(c[i]) != 0;
    }
    for (int k = 0; k < w->n_totals; k++) {
        double off = 0.0, terms = 0.0;
        for (int i = 0; i < S; i++) {
            double weight = w->totals[(ptrdiff_t)k * S + i];
            off += weight * (c[i] - u->feed[i]);
            terms += fabs(weight) * (fabs(c[i]) + u->feed[i]);
        }
        lost |= fabs(off) > INVARIANT * terms;
    }
    if (asked > u->endless_from)
        return MT_UNBOUNDED_AT_ZERO;
    if (finite) {
        for (int i = 0; i < S; i++)
            u->slope[i] = fmax(c[i], 0.0);
        if (u->odd || takes_odd_root(d, u->f.cut, u->slope))
            return MT_NOT_FINITE;
    }
    return !finite ? (u->between > 0 ? MT_NOT_CONVERGED : MT_WORK_CAP) : negative ? MT_NEGATIVE : lost ? MT_INVARIANT : MT_OK;
}

/* Why the tube was given up: beside a vanishing species it is that species' doing. */
static int stopped(const run_state *u)
{
    const network *w = u->d->net;
    for (int i = 0; i < w->species; i++)
        if (u->s.status != MT_OK && w->endless[i] && u->s.c[i] < VANISHING * u->scale)
            return MT_UNBOUNDED_AT_ZERO;
    return u->s.status != MT_OK ? u->s.status : MT_NOT_CONVERGED;
}

static void check(run_state *u)
{
    desk *d = u->d;
    const network *w = d->net;
    const mt_tubes *a = u->all;
    double *at = a->exhausted_at + u->row * w->all;
    for (int64_t m = 0; m < a->m; m++) {
        double *c = a->c + (u->row * a->m + m) * w->all, asked = a->asked[u->row * a->m + m];
        int32_t *status = a->status + u->row * a->m + m;
        for (int i = 0; i < w->species; i++)
            u->point[i] = c[w->present[i]];
        *status = *status < 0  ? stopped(u)
                  : asked > 0  ? check_point(u, asked, u->point)
                  : asked == 0 ? MT_OK
                               : MT_NOT_FINITE; /* no residence time: less than none, or no number */
        for (int i = 0; i < w->all && *status == MT_OK; i++)
            if (!isfinite(c[i]))
                *status = MT_NOT_FINITE;
        for (int i = 0; i < w->all && *status != MT_OK; i++)
            c[i] = NAN;
        if (*status == MT_OK)
            store_point(u, m);
    }
    for (int i = 0; i < w->species; i++)
        at[w->present[i]] = u->exhausted[i];
}

static void follow(run_state *u, int64_t row)
{
    const network *w = u->d->net;
    const mt_tubes *a = u->all;
    load(u, row);
    u->waiting = 0, u->between = MOST_STEPS;
    for (int i = 0; i < w->all; i++)
        a->exhausted_at[row * w->all + i] = w->wanted[i] ? 0.0 : NAN;
    for (int64_t m = 0; m < a->m; m++) {
        int ahead = a->asked[row * a->m + m] > 0 && w->laws.terms;
        memcpy(a->c + (row * a->m + m) * w->all, a->feed + row * w->all, (size_t)w->all * sizeof(double));
        a->status[row * a->m + m] = ahead ? -1 : MT_OK; /* -1: to be reached */
        u->waiting += ahead;
    }
    while (u->s.active && u->waiting) {
        if (!attempt(u->d, &u->s))
            continue;
        if (w->moving.n)
            note_ends(u);
        cover(u);
    }
    check(u);
    a->steps[row] = u->s.steps;
    a->work[row] = (int32_t)(u->d->work < INT32_MAX ? u->d->work : INT32_MAX);
}

static int is_complete(const network *w, const mt_tubes *a)
{
    return a->n >= 0 && a->m >= 0 && a->feed && a->asked && a->T && (a->p || !w->laws.parameters) && a->c && a->status &&
           a->exhausted_at && a->steps && a->work;
}

int mt_solve_tubes(const mt_network *w, const mt_tubes *all)
{
    desk d;
    run_state u;
    if (!w || !all || !is_complete(w, all))
        return MT_BAD_REQUEST;
    if (!desk_open(&d, w, 0))
        return MT_NO_MEMORY;
    open_run(&u, &d, all);
    for (int64_t row = 0; row < all->n; row++)
        follow(&u, row);
    desk_close(&d);
    return MT_DONE;
}

typedef struct {
    desk d;
    run_state u;
    mt_tubes all;
} seat;

static int again(void *self)
{
    seat *s = self;
    follow(&s->u, 0);
    return MT_DONE;
}

static void leave(void *self)
{
    seat *s = self;
    desk_close(&s->d);
    free(s);
}

mt_again *mt_tube_again(const mt_network *w, const mt_tubes *tube)
{
    if (!w || !tube || tube->n != 1 || !is_complete(w, tube))
        return NULL;
    seat *s = calloc(1, sizeof *s);
    if (!s)
        return NULL;
    s->all = *tube;
    if (!desk_open(&s->d, w, 0)) {
        leave(s);
        return NULL;
    }
    open_run(&s->u, &s->d, &s->all);
    return keep_vessel(w, s, (vessel){again, leave, tube->feed, tube->T, tube->p});
}
