/* Laws near zero concentrations, and what vessels gain by them.
 *
 * Within a depth of zero a law of order q < 1 in a species that it consumes is continued as
 * r(c + depth) c/(c + depth): zero at zero, exact for q = 1. Why this and not a line or a parabola joined at
 * a floor stands in the reference engine (cutoff.py), which this file follows line by line.
 */
#include <string.h>

#include "kernel.h"

#define FAR 1e16 /* depths from zero at which the cut is rounding */
#define LOW 1e6  /* depths from zero within which a law of order zero no longer gets all it asks for */

static int is_far(laws l, const double *c)
{
    for (int k = 0; k < l.rule->n; k++)
        if (c[l.rule->species[k]] < FAR * l.depth[k])
            return 0;
    return 1;
}

/* True where a species marked in `among` (or any) is as good as zero for a law of order zero. */
int any_low(laws l, const double *c, const uint8_t *among)
{
    for (int k = 0; k < l.rule->n; k++) {
        int i = l.rule->species[k];
        if ((!among || among[i]) && c[i] < LOW * l.depth[k])
            return 1;
    }
    return 0;
}

/* Lifts what the laws read and prepares their factors. */
static const double *lift(desk *d, laws l, const double *c)
{
    memcpy(d->lifted, c, (size_t)d->net->species * sizeof *c);
    for (int k = 0; k < l.rule->n; k++) {
        int i = l.rule->species[k];
        double now = c[i], depth = l.depth[k], whole = now < 0 ? depth : now + depth;
        d->lifted[i] = (now > 0 ? now : 0.0) + depth;
        d->share[k] = now / whole;
        d->rise[k] = depth / (whole * whole);
    }
    return d->lifted;
}

/* c/(c + depth) to the power q of one species of a law, and its derivative. */
static double cut_factor(const desk *d, int k, double q, double *slope)
{
    double share = d->share[k], some = share > 0 ? share : 0.0;
    if (q == 1) {
        *slope = d->rise[k];
        return share;
    }
    *slope = q > 1 ? q * pow(some, q - 1.0) * d->rise[k] : 0.0;
    return pow(some, q);
}

/* A law stops where two of its species are negative: their product would drive both further away. */
static int stops(const desk *d, laws l, int t)
{
    int negative = 0;
    for (int m = l.rule->start[t]; m < l.rule->start[t + 1]; m++)
        negative += d->share[l.rule->which[m]] < 0;
    return negative >= 2;
}

/* The factor of term t but for its part `without` (-1: whole). */
static double product(const desk *d, laws l, int t, int without)
{
    double out = 1.0, unused;
    for (int m = l.rule->start[t]; m < l.rule->start[t + 1]; m++)
        if (m != without)
            out *= cut_factor(d, l.rule->which[m], l.rule->power[m], &unused);
    return out;
}

static void fill(desk *d, const double *c)
{
    const program *q = &d->net->laws;
    memcpy(d->registers, c, (size_t)q->leaves * sizeof *c);
    run(q, q->prelude, q->prelude + q->body, d->registers, 0);
    d->work++;
}

/* Rates of all terms. */
void law_rates(desk *d, laws l, const double *c, double *r)
{
    const program *q = &d->net->laws;
    int far = is_far(l, c);
    fill(d, far ? c : lift(d, l, c));
    for (int t = 0; t < q->terms; t++)
        r[t] = d->registers[q->output[t]];
    if (!far)
        for (int t = 0; t < q->terms; t++)
            if (l.rule->start[t + 1] > l.rule->start[t])
                r[t] = stops(d, l, t) ? 0.0 * r[t] : r[t] * product(d, l, t, -1);
}

/* Multiplies the derivatives of term t by its factor, and adds those of the factor. */
static void cut_slopes(desk *d, laws l, int t, const double *c, double *r, double *v)
{
    const program *q = &d->net->laws;
    int from = l.rule->start[t], to = l.rule->start[t + 1];
    int stopped = stops(d, l, t);
    double whole = stopped ? 0.0 : product(d, l, t, -1);
    for (int m = q->entry_start[t]; m < q->entry_start[t + 1]; m++)
        v[m] *= whole;
    for (int k = 0; k < l.rule->n; k++) /* below zero a lifted argument stands still */
        if (c[l.rule->species[k]] < 0)
            for (int m = q->entry_start[t]; m < q->entry_start[t + 1]; m++)
                if (q->entry_leaf[m] == l.rule->species[k])
                    v[m] = 0.0;
    for (int m = from; m < to && !stopped; m++) {
        double slope;
        cut_factor(d, l.rule->which[m], l.rule->power[m], &slope);
        v[l.rule->entry[m]] += r[t] * product(d, l, t, m) * slope;
    }
    r[t] *= whole;
}

/* Rates of all terms and their derivatives, entry by entry. */
void law_slopes(desk *d, laws l, const double *c, double *r, double *v)
{
    const program *q = &d->net->laws;
    int far = is_far(l, c);
    fill(d, far ? c : lift(d, l, c));
    for (int t = 0; t < q->terms; t++) {
        r[t] = d->registers[q->output[t]];
        reverse(q, t, d->registers, d->adjoints);
        for (int m = q->entry_start[t]; m < q->entry_start[t + 1]; m++)
            v[m] = q->entry_read[m] ? d->adjoints[q->entry_leaf[m]] : 0.0;
    }
    if (!far)
        for (int t = 0; t < q->terms; t++)
            cut_slopes(d, l, t, c, r, v);
}

static void run_strictly(desk *d, laws l, const double *c, int strict)
{
    const program *q = &d->net->laws;
    memcpy(d->registers, lift(d, l, c), (size_t)q->leaves * sizeof *c);
    run(q, q->prelude, q->prelude + q->body, d->registers, strict);
}

static int all_terms_finite(const desk *d)
{
    const program *q = &d->net->laws;
    for (int t = 0; t < q->terms; t++)
        if (!isfinite(d->registers[q->output[t]]))
            return 0;
    return 1;
}

/* True where every law has a value with no root of a negative number taken. */
int laws_defined(desk *d, laws l, const double *c)
{
    run_strictly(d, l, c, 1);
    return all_terms_finite(d);
}

/* True where a law has a value only because a root of a negative number is continued. */
int takes_odd_root(desk *d, laws l, const double *c)
{
    run_strictly(d, l, c, 1);
    if (all_terms_finite(d))
        return 0;
    run_strictly(d, l, c, 0);
    return all_terms_finite(d);
}

/* nu' r: netted by reaction first. Near equilibrium the terms of a reaction almost cancel; their difference
 * is exact, and its error goes to all species in the ratio of the equation. */
void gains(desk *d, const double *r, double *out)
{
    const network *w = d->net;
    const double *net = r;
    if (!w->plain) {
        for (int j = 0; j < w->reactions; j++)
            d->net_r[j] = 0.0;
        for (int t = 0; t < w->laws.terms; t++)
            d->net_r[w->owner[t]] += w->sign[t] * r[t];
        net = d->net_r;
    }
    for (int i = 0, k = 0; i < w->species; i++) {
        double sum = 0.0;
        for (; k < w->maker_start[i + 1]; k++)
            sum += w->made[k] * net[w->maker[k]];
        out[i] = sum;
    }
}

/* The sum of the sizes of all terms, by species. */
void traffic(const network *w, const double *r, double *out)
{
    for (int i = 0; i < w->species; i++)
        out[i] = 0.0;
    for (int t = 0; t < w->laws.terms; t++) {
        int j = w->owner[t];
        double size = fabs(r[t]);
        for (int k = w->gain_start[j]; k < w->gain_start[j + 1]; k++)
            out[w->gain_species[k]] += fabs(w->gain[k]) * size;
    }
}

/* nu' dr/dc, (S, S), from derivatives of terms. */
void spread_jacobian(desk *d, const double *v, double *jacobian)
{
    const network *w = d->net;
    int S = w->species;
    double *net = d->net_v;
    memset(net, 0, (size_t)w->nets * sizeof *net);
    memset(jacobian, 0, (size_t)S * (size_t)S * sizeof *jacobian);
    for (int t = 0; t < w->laws.terms; t++)
        for (int m = w->laws.entry_start[t]; m < w->laws.entry_start[t + 1]; m++)
            net[w->entry_net[m]] += w->sign[t] * v[m];
    for (int j = 0; j < w->reactions; j++)
        for (int k = w->gain_start[j]; k < w->gain_start[j + 1]; k++) {
            double *row = jacobian + (ptrdiff_t)S * w->gain_species[k], gain = w->gain[k];
            for (int m = w->net_start[j]; m < w->net_start[j + 1]; m++)
                row[w->net_leaf[m]] += gain * net[m];
        }
}

/* dc/dt of a vessel. */
void flow_slope(desk *d, const flow *f, const double *c, double *out)
{
    law_rates(d, f->cut, c, d->r);
    gains(d, d->r, out);
    if (f->exchange > 0)
        for (int i = 0; i < d->net->species; i++)
            out[i] += (f->feed[i] - c[i]) * f->exchange;
}

/* dc/dt, and the sum of the sizes of its terms. */
void flow_balance(desk *d, const flow *f, const double *c, double *net, double *gross)
{
    law_rates(d, f->cut, c, d->r);
    gains(d, d->r, net);
    traffic(d->net, d->r, gross);
    if (f->exchange > 0)
        for (int i = 0; i < d->net->species; i++) {
            net[i] += (f->feed[i] - c[i]) * f->exchange;
            gross[i] += (f->feed[i] + fabs(c[i])) * f->exchange;
        }
}

/* dc/dt and its Jacobian. */
void flow_linear(desk *d, const flow *f, const double *c, double *out, double *jacobian)
{
    int S = d->net->species;
    law_slopes(d, f->cut, c, d->r, d->v);
    gains(d, d->r, out);
    spread_jacobian(d, d->v, jacobian);
    if (f->exchange > 0)
        for (int i = 0; i < S; i++) {
            out[i] += (f->feed[i] - c[i]) * f->exchange;
            jacobian[(ptrdiff_t)i * S + i] -= f->exchange;
        }
}
