/* Adaptive integration of one vessel: explicit until stability rather than accuracy limits the step, or a
 * species sinks to where its laws are cut; then stiff. The mesh depends on where it starts and on nothing
 * else: not on where the answer is wanted.
 */
#include <string.h>

#include "kernel.h"

#define SAFETY 0.9
#define MOST_SHRINK 0.1
#define TOO_FAR 0.3       /* of a step that ends below zero */
#define AHEAD 0.98        /* of the way to zero */
#define FIRST_CHANGE 0.1  /* a first step may change what is there by a tenth */
#define STIFF_LIMIT 3.0   /* |h lambda|: accuracy asks for less than 1, stability for less than 6 */
#define STIFF_STEPS 12.0  /* that many such steps, accepted or not, are no accident */
#define PATIENCE 500      /* explicit steps after which something must be stiff that the estimate misses */
#define PARDON 0.25       /* what a step that is not so limited takes off the count */
#define SMALLEST 1e-40    /* of the time gone: where a fast law ends steps are tiny */
#define RUNAWAY 1e6       /* growth, and share of the time gone, that show concentrations running away */
#define RUSH 1e-6
#define REVIEW_EVERY 400 /* steps */
#define PROGRESS 1e-9    /* of the time gone, that so many steps have to bring */
#define LARGEST 1e250

/* of the tolerance */
#define STARVED 1e-18  /* of the largest concentration: where supply meets demand what is left is rounding */
#define ROUNDING 1e-15 /* of half order: the root of its concentration is such a difference */
#define FALLS 1e-6     /* of all rates that make or take it: it is on its way to zero */
#define SHARE_OF_DEPTH 0.1
#define LOW 1e6
#define LEAK 10.0

int step_explicit(desk *d, const flow *f, const double *c, double h, const double *least, double *after,
                  double *error, double *stiffness);
int step_stiff(desk *d, const flow *f, const double *c, double h, const double *least, double *after, double *error,
               double *stiffness);

/* How a step has to shrink where its error is `size` times what is accepted: by the order of the estimate. */
static double eighth_root(double size) { return 1.0 / sqrt(sqrt(sqrt(size))); }
static double fifth_root(double size) { return pow(size, -0.2); }

/* The explicit method's steps grow twofold at most: a longer leap may pass the knee of an adsorption law
 * without an error that shows (measured on 3000 tubes of r = A/(K + A): 1e-7 became 1e-8). */
const method METHODS[2] = {
    {eighth_root, 12, 2.0, step_explicit},
    {fifth_root, 9, 6.0, step_stiff},
};

/* The largest error in units of what is accepted; finite: errors and states are numbers. */
double missed(desk *d, const tolerance *o, const flow *f, const double *error, const double *before,
              const double *after, int kind, int *finite)
{
    const network *w = d->net;
    int S = w->species, any_starved = w->n_starved;
    double *keep = d->next, *net = take(d, S), *gross = take(d, S), worst = 0.0;
    *finite = 1;
    if (any_starved)
        flow_balance(d, f, before, net, gross);
    for (int i = 0; i < S; i++) {
        double size = fabs(before[i]) > fabs(after[i]) ? fabs(before[i]) : fabs(after[i]);
        double accepted = o->least[i] + o->relative[kind] * size;
        if (w->ends[i])
            accepted += ROUNDING * sqrt(size * o->scale);
        if (any_starved && w->starved[i] && net[i] >= -FALLS * gross[i])
            accepted += STARVED * o->scale;
        double miss = fabs(error[i]) / accepted;
        *finite &= isfinite(miss) && isfinite(after[i]);
        worst = miss > worst ? miss : worst;
    }
    d->next = keep;
    return worst;
}

/* What species near zero still gain or lose at the end of a step, in units of what is accepted; 0 if none.
 *
 * A Rosenbrock method takes a law of order zero that is cut for a stiff spring; where supply has come to
 * exceed it the law gives way, and the method would not notice that the excess of a whole step is gone.
 */
double leaked(desk *d, const tolerance *o, const flow *f, const double *before, const double *after, double h)
{
    const network *w = d->net;
    int S = w->species, any = 0;
    for (int i = 0; w->n_starved && i < S; i++)
        any |= w->starved[i] && before[i] < LOW / SHARE_OF_DEPTH * o->least[i];
    if (!any)
        return 0.0;
    double *keep = d->next, *slope = take(d, S), *net = take(d, S), *gross = take(d, S), worst = 0.0;
    flow_slope(d, f, after, slope);
    flow_balance(d, f, before, net, gross);
    for (int i = 0; i < S; i++) {
        if (!w->starved[i] || !(before[i] < LOW / SHARE_OF_DEPTH * o->least[i]))
            continue;
        double gain = fabs(slope[i]) * h / (LEAK * o->relative[STIFF] * o->scale);
        int rises = net[i] > FALLS * gross[i] && net[i] * h > LOW / SHARE_OF_DEPTH * o->least[i];
        if (rises && after[i] < before[i])
            gain = INFINITY;
        worst = gain > worst ? gain : worst;
    }
    d->next = keep;
    return worst;
}

/* A step that changes what is there a little; species still at zero don't count. */
static double first_step(desk *d, const flow *f, const double *c)
{
    int S = d->net->species;
    double *keep = d->next, *slope = take(d, S), change = 0.0, made = 0.0, largest = 0.0;
    flow_slope(d, f, c, slope);
    for (int i = 0; i < S; i++) {
        double there = fabs(c[i]), fast = fabs(slope[i]);
        largest = there > largest ? there : largest;
        if (there > 0)
            change = fast / there > change || fast != fast ? fast / there : change;
        else
            made = fast > made || fast != fast ? fast : made;
    }
    d->next = keep;
    made /= largest;
    double first = FIRST_CHANGE / (isfinite(made) && made > change ? made : change);
    return isfinite(first) && first > 0 ? first : 1.0;
}

/* c, before, after and error, (species) each, are the caller's memory. */
void stepper_start(desk *d, stepper *s, const flow *f, const tolerance *o, const totals *w, const double *c,
                   int most_steps, int mode)
{
    int S = d->net->species;
    double largest = 0.0;
    s->flow = f, s->tolerance = o, s->totals = w;
    s->t = s->late = s->stiff_steps = s->reviewed = s->from = s->stride = 0.0;
    s->mode = s->last_mode = mode, s->active = 1, s->status = MT_OK, s->steps = 0, s->rejected = 0, s->work = 0;
    s->most_steps = most_steps;
    memcpy(s->c, c, (size_t)S * sizeof *c);
    for (int i = 0; i < S; i++)
        largest = fabs(c[i]) > largest ? fabs(c[i]) : largest;
    s->largest = largest > 0 ? largest : INFINITY;
    d->known = 0;
    s->h_before = s->size_before = 1e-300; /* no step before the first: nothing is foreseen */
    s->h = first_step(d, f, c);
}

/* Where a rejected step would have used a species up, the next leaves a little of it. */
static void approach_zero(desk *d, stepper *s, double h)
{
    laws l = s->flow->cut;
    double *keep = d->next, *slope = take(d, d->net->species), left = INFINITY;
    if (l.rule->n)
        flow_slope(d, s->flow, s->c, slope);
    for (int k = 0; k < l.rule->n; k++) {
        int i = l.rule->species[k];
        if (slope[i] < 0 && s->c[i] > l.depth[k] && -s->c[i] / slope[i] < left)
            left = -s->c[i] / slope[i];
    }
    if (left < h)
        s->h = AHEAD * left;
    d->next = keep;
}

/* Gives up where the step vanishes, the state explodes or the allowance is spent. */
static void look_for_trouble(desk *d, stepper *s, int fine, int finite)
{
    double size = 0.0;
    int stuck = !fine && (s->h <= SMALLEST * s->t || s->h < 1e-290);
    for (int i = 0; i < d->net->species; i++)
        size = fabs(s->c[i]) > size ? fabs(s->c[i]) : size;
    int explodes = size > LARGEST || (size > RUNAWAY * s->largest && s->h < RUSH * s->t);
    if (s->steps % REVIEW_EVERY == 0) {
        stuck |= s->t - s->reviewed <= PROGRESS * s->t;
        s->reviewed = s->t;
    }
    int status = explodes                        ? MT_BLOW_UP
                 : stuck && !finite              ? MT_NOT_FINITE
                 : stuck                         ? MT_STEP_TOO_SMALL
                 : s->steps >= s->most_steps     ? MT_WORK_CAP
                                                 : MT_OK;
    if (status != MT_OK)
        s->status = status, s->active = 0;
}

static void look_for_stiffness(stepper *s, double stiffness, int moved)
{
    s->stiff_steps = stiffness > STIFF_LIMIT ? s->stiff_steps + 1.0 : s->stiff_steps - PARDON;
    if (s->stiff_steps < 0)
        s->stiff_steps = 0;
    if (s->stiff_steps >= STIFF_STEPS || s->steps >= PATIENCE || (moved && any_low(s->flow->cut, s->c, NULL)))
        s->mode = STIFF;
}

/* Tries one step; returns whether it was accepted. Then `before`, `from` and `stride` tell what it was. */
int attempt(desk *d, stepper *s)
{
    const method *m = &METHODS[s->mode];
    int S = d->net->species, finite, negative = 0, fine;
    double h = s->h, stiffness = 0.0, least = MOST_SHRINK;
    s->last_mode = s->mode;
    m->step(d, s->flow, s->c, h, s->tolerance->least, s->after, s->error, &stiffness);
    double size = missed(d, s->tolerance, s->flow, s->error, s->c, s->after, s->mode, &finite);
    size = finite ? (size > 1e-10 ? size : 1e-10) : INFINITY;
    double shrink = SAFETY * m->root(size);
    for (int i = 0; i < S; i++)
        negative |= s->after[i] < -s->tolerance->least[i];
    if (negative && shrink > TOO_FAR)
        shrink = TOO_FAR;
    double leak = finite ? leaked(d, s->tolerance, s->flow, s->c, s->after, h) : 0.0;
    if (leak > 1.0 && SAFETY / leak < shrink)
        shrink = SAFETY / leak;
    size = leak > size ? leak : size;
    fine = size <= 1.0 && !negative;
    double most = s->rejected && fine ? 1.0 : m->most_growth;
    shrink = shrink > most ? most : shrink;
    shrink = shrink > least ? shrink : least;
    s->steps++;
    s->work += m->evaluations;
    s->h = (h < LARGEST ? h : LARGEST) * shrink;
    if (!fine)
        approach_zero(d, s, h);
    s->rejected = !fine;
    if (fine && m == &METHODS[EXPLICIT]) {
        /* Where steps have to become shorter and shorter, towards the end of a species of fractional order, the
         * next is foreseen to (K. Gustafsson, ACM Trans. Math. Softw. 20 (1994) 496): else every second fails. */
        double trend = h / s->h_before, next = h * SAFETY * trend * m->root(size * size / s->size_before);
        if (trend < 1.0 && next < s->h)
            s->h = next;
        s->h_before = h, s->size_before = size;
    }
    if (fine) {
        double begun = s->t, step = h + s->late; /* time is kept to twice the digits */
        memcpy(s->before, s->c, (size_t)S * sizeof *s->c);
        memcpy(s->c, s->after, (size_t)S * sizeof *s->c);
        s->from = begun, s->stride = h;
        s->t = begun + step;
        s->late = step - (s->t - begun);
        if (s->totals)
            restore(d, s->totals, s->c, s->t);
        if (d->known && s->last_mode == EXPLICIT) /* the slope there is as good after a move of the last digit */
            memcpy(d->known_at, s->c, (size_t)S * sizeof *s->c);
    }
    look_for_trouble(d, s, fine, finite);
    if (s->last_mode == EXPLICIT)
        look_for_stiffness(s, stiffness, fine);
    return fine;
}
