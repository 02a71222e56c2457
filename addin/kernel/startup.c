/* The start-up of a tank: dc/dt = (feed - c)/tau + nu' r(c) from its first contents until it rests.
 *
 * Which of several steady states a tank has is decided here: a root of Newton's method is only taken where
 * the start-up comes to coincide with it.
 */
#include <string.h>

#include "kernel.h"

#define RELATIVE 1e-6 /* error of a step: enough to stay on the right side of a divide */
#define MOST_STEPS 1500
#define ABSOLUTE 1e-25 /* of the largest concentration: trace species are followed relatively */
#define SHARE_OF_DEPTH 0.1
#define NOTHING 1e-10 /* of the least concentration: where Newton's method begins for a species at zero */
#define LOOK_EVERY 4  /* attempts between two looks for the state ahead */
#define SLOW 0.3      /* relative change per residence time below which a look is worth its cost */
#define LATE 3.0      /* residence times after which a look is worth it anyway */
#define COINCIDES 1e-4
#define DEPARTURE 45.0 /* doublings of e after which rounding would have left an unstable state */
#define SWINGS 8       /* turning points without rest that tell oscillation from slowness */
#define VANISHING 1e-5 /* of the largest concentration: where a law of negative order is about to end */
#define LOW 1e6
#define DEEPER 1e-30 /* depth of the steady laws over that of the integrator's */

typedef struct {
    desk *d;
    const tank *t;
    const uint8_t *fed;
    flow f;
    tolerance o;
    totals w;
    stepper s;
    double scale, unstable_until;
    double *near, *guess, *slope;
    int8_t *direction;
    int swings;
    double *c;
    outcome *out;
} startup;

static void count_swings(startup *u)
{
    int turned = 0;
    for (int i = 0; i < u->d->net->species; i++) {
        double move = u->s.c[i] - u->s.before[i];
        int sign = (move > 0) - (move < 0);
        turned |= sign * u->direction[i] < 0;
        u->direction[i] = (int8_t)sign;
    }
    u->swings += turned;
}

/* Where Newton's method begins: cut species as deep below the integrator's depth as they are in it. */
static void guess(startup *u)
{
    const network *w = u->d->net;
    for (int i = 0; i < w->species; i++)
        u->guess[i] = u->s.c[i] > 0 ? u->s.c[i] : NOTHING * u->o.least[i];
    for (int k = 0; k < w->moving.n; k++) {
        int i = w->moving.species[k];
        if (w->starved[i] && u->guess[i] < LOW * u->d->depth_moving[k])
            u->guess[i] *= DEEPER;
    }
}

static void finish(startup *u, int status)
{
    u->out->status = status;
    u->s.active = 0;
}

/* Takes a stable state; waits at an unstable one until rounding must have carried the tank away. */
static void arrive(startup *u)
{
    double rate, swing;
    int unstable;
    growth(u->d, u->t, u->guess, 0, &rate, &swing, &unstable);
    if (!unstable) {
        memcpy(u->c, u->guess, (size_t)u->d->net->species * sizeof *u->c);
        finish(u, MT_OK);
        return;
    }
    double until = u->s.t + DEPARTURE / rate;
    u->unstable_until = until < u->unstable_until ? until : u->unstable_until;
    if (u->s.t >= u->unstable_until)
        finish(u, MT_UNSTABLE);
}

static int is_slow(startup *u)
{
    if (u->s.t > LATE * u->t->tau)
        return 1;
    flow_slope(u->d, &u->f, u->s.c, u->slope);
    for (int i = 0; i < u->d->net->species; i++)
        if (!(fabs(u->slope[i]) * u->t->tau <= SLOW * fabs(u->s.c[i]) + u->near[i] + u->o.least[i]))
            return 0;
    return 1;
}

static int has_faded(const startup *u)
{
    if (!u->fed || !(u->s.t > 20.0 * u->t->tau))
        return 0;
    for (int i = 0; i < u->d->net->species; i++)
        if (!u->fed[i] && u->s.c[i] < u->o.least[i])
            return 1;
    return 0;
}

/* Where the start-up has become slow, ask Newton's method for the state ahead. */
static void look(startup *u)
{
    const network *w = u->d->net;
    int steps = 0;
    if (any_low(u->f.cut, u->s.c, w->endless)) {
        finish(u, MT_UNBOUNDED_AT_ZERO);
        return;
    }
    if (has_faded(u)) {
        u->out->faded = 1;
        u->s.active = 0;
        return;
    }
    if (!is_slow(u))
        return;
    guess(u);
    int settled = newton(u->d, u->t, u->guess, 30, &steps);
    u->out->iterations += steps;
    if (!settled)
        return;
    for (int i = 0; i < w->species; i++)
        if (!(fabs(u->guess[i] - u->s.c[i]) <= COINCIDES * u->guess[i] + u->near[i] + u->o.least[i]))
            return;
    arrive(u);
}

/* Why the tank did not come to rest. */
static void explain(startup *u)
{
    const network *w = u->d->net;
    if (u->s.status == MT_OK)
        return;
    int status = u->s.status;
    if (status == MT_WORK_CAP && u->swings >= SWINGS)
        status = MT_OSCILLATES;
    for (int i = 0; i < w->species; i++)
        if (w->endless[i] && u->s.c[i] < VANISHING * u->scale)
            status = MT_UNBOUNDED_AT_ZERO;
    u->out->status = status;
}

/* Takes up a tank where the integrator got stuck; a state it oscillates about stays refused. */
static void creep_on(startup *u)
{
    double rate, swing;
    int unstable, steps = 0, found;
    guess(u);
    found = creep(u->d, u->t, u->guess, &steps);
    u->out->iterations += steps;
    if (!found)
        return;
    growth(u->d, u->t, u->guess, 0, &rate, &swing, &unstable);
    u->out->status = !unstable ? MT_OK : swing > 0 ? MT_OSCILLATES : MT_UNSTABLE;
    memcpy(u->c, u->guess, (size_t)u->d->net->species * sizeof *u->c);
}

static void prepare(startup *u, const double *start)
{
    desk *d = u->d;
    const network *w = d->net;
    int S = w->species;
    double *least = take(d, S);
    u->near = take(d, S), u->guess = take(d, S), u->slope = take(d, S);
    u->direction = (int8_t *)take(d, S);
    u->s.c = take(d, S), u->s.before = take(d, S), u->s.after = take(d, S), u->s.error = take(d, S);
    u->w.first = take(d, w->n_totals), u->w.last = take(d, w->n_totals);
    for (int i = 0; i < S; i++) {
        least[i] = ABSOLUTE * u->scale;
        u->near[i] = 0.0;
        u->direction[i] = 0;
    }
    for (int k = 0; k < w->moving.n; k++) {
        int i = w->moving.species[k];
        u->near[i] = LOW * d->depth_moving[k];
        if (w->ends[i])
            least[i] = SHARE_OF_DEPTH * d->depth_moving[k];
    }
    u->f = (flow){{&w->moving, d->depth_moving}, u->t->feed, 1.0 / u->t->tau};
    u->o = (tolerance){{RELATIVE, RELATIVE}, least, u->scale};
    totals_of(d, &u->w, start, u->t->feed, u->f.exchange);
    stepper_start(d, &u->s, &u->f, &u->o, &u->w, start, MOST_STEPS, STIFF);
}

/* Follows a start-up from `start` and writes the state at which it rests to c.
 *
 * fed: (species) what the feed alone brings about, or NULL: all. scale: the largest concentration.
 */
void start_up(desk *d, const tank *t, const double *start, const uint8_t *fed, double scale, double *c, outcome *out)
{
    double *keep = d->next;
    startup u = {.d = d, .t = t, .fed = fed, .scale = scale, .unstable_until = INFINITY, .c = c, .out = out};
    out->status = MT_WORK_CAP;
    prepare(&u, start);
    for (int tries = 1; u.s.active; tries++) {
        if (attempt(d, &u.s))
            count_swings(&u);
        if (tries % LOOK_EVERY == 0 && u.s.active)
            look(&u);
    }
    explain(&u);
    int stuck = out->status == MT_WORK_CAP || out->status == MT_OSCILLATES || out->status == MT_STEP_TOO_SMALL;
    if (stuck && !out->faded)
        creep_on(&u);
    d->next = keep;
}
