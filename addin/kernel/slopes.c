/* Derivatives of outlets by feed, residence time, temperature and every parameter: what all share, and tanks.
 *
 * A tank's follow from its balance: (I - tau J) dc = d(feed + tau nu' r).
 */
#include <string.h>

#include "slopes.h"

#define STEADY_NOTHING 1e-200
#define NO_COLUMN -1

int64_t tangent_room(const network *w)
{
    int64_t P = w->laws.parameters, g = w->laws.registers;
    return (1 + P) * g + 4 * g + 2 * (int64_t)w->laws.terms;
}

void open_tangents(tangents *x, desk *d, laws l)
{
    const program *q = &d->net->laws;
    x->d = d, x->l = l;
    x->columns = q->leaves + 1 + q->parameters;
    x->prelude = take(d, (int64_t)(1 + q->parameters) * q->registers);
    x->a = take(d, q->registers), x->b = take(d, q->registers), x->ab = take(d, q->registers);
    x->base = take(d, q->registers);
    x->ra = take(d, q->terms), x->rab = take(d, q->terms);
}

/* What changes with T and each parameter before any concentration is known. */
void bind_tangents(tangents *x)
{
    const program *q = &x->d->net->laws;
    for (int k = 0; k <= q->parameters; k++) {
        double *a = x->prelude + (ptrdiff_t)k * q->registers;
        memset(a, 0, (size_t)q->registers * sizeof *a);
        a[q->leaves + k] = 1.0; /* T, then the parameters, follow the leaves */
        tangent(q, 0, q->prelude, x->d->registers, a, NULL, NULL);
    }
}

/* Puts a direction into register tangents: of concentrations, and of T or a parameter by its column. */
static void aim(const tangents *x, int column, const double *c, const double *direction, double *a)
{
    const program *q = &x->d->net->laws;
    if (column >= q->leaves)
        memcpy(a, x->prelude + (ptrdiff_t)(column - q->leaves) * q->registers, (size_t)q->registers * sizeof *a);
    else
        memset(a, 0, (size_t)q->registers * sizeof *a);
    memcpy(a, direction, (size_t)q->leaves * sizeof *a);
    for (int k = 0; k < x->l.rule->n; k++)
        if (c[x->l.rule->species[k]] < 0)
            a[x->l.rule->species[k]] = 0.0; /* below zero a lifted argument stands still */
}

/* The factor of a term's cut: value, and its derivatives along directions a and b. */
static double factor_tangent(const tangents *x, int t, const double *c, const double *a, const double *b, double *fa,
                             double *fb, double *fab)
{
    const cut *r = x->l.rule;
    double f = 1.0;
    int negative = 0;
    *fa = *fb = *fab = 0.0;
    for (int m = r->start[t]; m < r->start[t + 1]; m++) {
        int k = r->which[m], i = r->species[k];
        double q = r->power[m], depth = x->l.depth[k], now = c[i], whole = now < 0 ? depth : now + depth;
        double share = now / whole, rise = depth / (whole * whole), bend = now < 0 ? 0.0 : -2.0 * rise / whole;
        double some = share > 0 ? share : 0.0;
        double g = q == 1 ? share : pow(some, q), g1 = q == 1 ? rise : q * pow(some, q - 1.0) * rise;
        double g2 = q == 1 ? bend : q * pow(some, q - 1.0) * bend + q * (q - 1.0) * pow(some, q - 2.0) * rise * rise;
        double ga = g1 * a[i], gb = g1 * b[i], gab = g2 * a[i] * b[i];
        negative += now < 0;
        *fab = *fab * g + *fa * gb + *fb * ga + f * gab; /* the product rule, factor by factor */
        *fa = *fa * g + f * ga;
        *fb = *fb * g + f * gb;
        f *= g;
    }
    if (negative >= 2)
        f = *fa = *fb = *fab = 0.0;
    return f;
}

/* Fills registers at c, for the tangents that follow. */
void place_tangents(tangents *x, const double *c, double *r)
{
    law_rates(x->d, x->l, c, r);
}

/* Change of dc/dt along (direction, column), registers g being filled at c. */
void slope_tangent(tangents *x, const double *g, const double *c, const double *direction, int column, double *out)
{
    const program *q = &x->d->net->laws;
    double unused;
    aim(x, column, c, direction, x->a);
    tangent(q, q->prelude, q->prelude + q->body, g, x->a, NULL, NULL);
    for (int t = 0; t < q->terms; t++) {
        int o = q->output[t];
        x->ra[t] = x->a[o];
        if (x->l.rule->start[t + 1] > x->l.rule->start[t]) {
            double fa, fb, f = factor_tangent(x, t, c, direction, direction, &fa, &fb, &unused);
            x->ra[t] = x->a[o] * f + g[o] * fa;
        }
    }
    gains(x->d, x->ra, out);
}

/* The Jacobian's change along (direction, column), times a vector. */
void jacobian_tangent(tangents *x, const double *g, const double *c, const double *direction, int column,
                             const double *vector, double *out)
{
    const program *q = &x->d->net->laws;
    aim(x, column, c, direction, x->a);
    aim(x, NO_COLUMN, c, vector, x->b); /* constants change along a only */
    memset(x->ab, 0, (size_t)q->registers * sizeof *x->ab);
    tangent(q, q->prelude, q->prelude + q->body, g, x->a, x->b, x->ab);
    for (int t = 0; t < q->terms; t++) {
        int o = q->output[t];
        x->rab[t] = x->ab[o];
        if (x->l.rule->start[t + 1] > x->l.rule->start[t]) {
            double fa, fb, fab, f = factor_tangent(x, t, c, direction, vector, &fa, &fb, &fab);
            x->rab[t] = x->ab[o] * f + x->a[o] * fb + x->b[o] * fa + g[o] * fab;
        }
    }
    gains(x->d, x->rab, out);
}

/* Writes a column of the answer: species that the network has not depend on nothing but their own feed. */
void write_column(const network *w, const mt_slopes *all, int64_t row, int place_of, const double *x)
{
    int64_t Q = (int64_t)w->all + 2 + w->laws.parameters;
    double *out = all->slope + row * w->all * Q + place_of;
    for (int i = 0; i < w->all; i++)
        out[i * Q] = 0.0;
    for (int i = 0; i < w->species; i++)
        out[w->present[i] * Q] = x ? x[i] : NAN;
}

/* Columns of species that are neither fed nor made: a first trace of one is another network. */
void write_absent(const network *w, const mt_slopes *all, int64_t row)
{
    int64_t Q = (int64_t)w->all + 2 + w->laws.parameters;
    double *out = all->slope + row * w->all * Q;
    for (int64_t k = 0; k < w->all * Q; k++)
        out[k] = NAN;
}

int column_place(const network *w, int column)
{
    if (column < w->species)
        return w->present[column];
    return w->all + 1 + column - w->species;
}

int are_finite(const double *x, int n)
{
    for (int i = 0; i < n; i++)
        if (!isfinite(x[i]))
            return 0;
    return 1;
}

void begin_slopes(desk *d, const mt_slopes *all, int64_t row, const cut *rule, double *depth, double *feed, double *scale)
{
    const network *w = d->net;
    double largest = 0.0;
    for (int i = 0; i < w->all; i++)
        largest = fmax(largest, all->feed[row * w->all + i]);
    *scale = largest > 0 ? largest : NOWHERE;
    for (int k = 0; k < rule->n; k++)
        depth[k] = rule->share[k] * *scale;
    for (int i = 0; i < w->species; i++)
        feed[i] = all->feed[row * w->all + w->present[i]];
    bind_case(&w->laws, d->registers, all->T[row], w->laws.parameters ? all->p + row * w->laws.parameters : NULL);
}

int slopes_complete(const network *w, const mt_slopes *a)
{
    return a->feed && a->tau && a->T && (a->p || !w->laws.parameters) && a->slope && a->status;
}

static void tank_slopes(desk *d, tangents *x, const mt_slopes *all, int64_t row, double *feed, double *c, double *b)
{
    const network *w = d->net;
    int S = w->species, fine = 1;
    double scale, tau = all->tau[row], *keep = d->next, *f = take(d, S), *terms = take(d, S);
    begin_slopes(d, all, row, x->l.rule, d->depth_steady, feed, &scale);
    bind_tangents(x);
    for (int i = 0; i < S; i++)
        c[i] = fmax(all->outlet[row * w->all + w->present[i]], STEADY_NOTHING * scale);
    write_absent(w, all, row);
    tank t = {x->l, feed, tau, STEADY_NOTHING * scale};
    tank_matrix(d, &t, c, f, terms, d->matrix);
    gains(d, d->r, b);
    factor_and_solve(d, d->matrix, c, b);
    fine &= are_finite(b, S);
    write_column(w, all, row, w->all, b);
    for (int k = 0; k < x->columns; k++) {
        memset(b, 0, (size_t)S * sizeof *b);
        if (k < S)
            b[k] = 1.0;
        else {
            memset(f, 0, (size_t)S * sizeof *f);
            place_tangents(x, c, d->r);
            slope_tangent(x, d->registers, c, f, k, b);
            for (int i = 0; i < S; i++)
                b[i] *= tau;
        }
        solve(d, b);
        fine &= are_finite(b, S);
        write_column(w, all, row, column_place(w, k), b);
    }
    all->status[row] = fine ? MT_OK : MT_NOT_FINITE;
    d->next = keep;
}

int mt_tank_slopes(const mt_network *w, const mt_slopes *all)
{
    desk d;
    tangents x;
    if (!w || !all || all->n < 0 || !slopes_complete(w, all) || !all->outlet)
        return MT_BAD_REQUEST;
    if (!desk_open(&d, w, tangent_room(w)))
        return MT_NO_MEMORY;
    open_tangents(&x, &d, (laws){&w->steady, d.depth_steady});
    double *feed = take(&d, w->species), *c = take(&d, w->species), *b = take(&d, w->species);
    for (int64_t row = 0; row < all->n; row++)
        tank_slopes(&d, &x, all, row, feed, c, b);
    desk_close(&d);
    return MT_DONE;
}
