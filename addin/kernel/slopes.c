/* Derivatives of outlets by feed, residence time, temperature and every parameter, by forward propagation.
 *
 * A tank's follow from its balance: (I - tau J) dc = d(feed + tau nu' r). A tube's are carried along its
 * steps: each step of the method is differentiated itself, so that they belong to the very numbers that the
 * method gives. For the Rosenbrock method that takes second derivatives of the laws in two directions, which
 * the register machine gives as well (program.c); differences of runs were weighed and left: they lose half
 * the digits.
 */
#include <string.h>

#include "kernel.h"
#include "tables.h"

#define MOST_STEPS 12000
#define MOST_CARRIED 400000 /* columns times steps: a step costs as much per column as two steps of the tube */
#define ABSOLUTE 1e-25
#define SHARE_OF_DEPTH 0.1
#define STEADY_NOTHING 1e-200
#define NO_COLUMN -1
#define LOW 1e6

/* Columns are numbered: feed of species 0.., tau, T, parameter 0.. */
typedef struct {
    desk *d;
    laws l;
    int columns;          /* that are carried: species, then T, then parameters */
    double *prelude;      /* (1 + parameters, registers): how all that is fixed changes */
    double *a, *b, *ab;   /* (registers) tangents */
    double *base;         /* (registers) the laws at the start of a step */
    double *ra, *rab;     /* (terms) */
} tangents;

static int64_t tangent_room(const network *w)
{
    int64_t P = w->laws.parameters, g = w->laws.registers;
    return (1 + P) * g + 4 * g + 2 * (int64_t)w->laws.terms;
}

static void open_tangents(tangents *x, desk *d, laws l)
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
static void bind_tangents(tangents *x)
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
static void place(tangents *x, const double *c, double *r)
{
    law_rates(x->d, x->l, c, r);
}

/* Change of dc/dt along (direction, column), registers g being filled at c. */
static void slope_tangent(tangents *x, const double *g, const double *c, const double *direction, int column, double *out)
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
static void jacobian_tangent(tangents *x, const double *g, const double *c, const double *direction, int column,
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
static void write_column(const network *w, const mt_slopes *all, int64_t row, int place_of, const double *x)
{
    int64_t Q = (int64_t)w->all + 2 + w->laws.parameters;
    double *out = all->slope + row * w->all * Q + place_of;
    for (int i = 0; i < w->all; i++)
        out[i * Q] = 0.0;
    for (int i = 0; i < w->species; i++)
        out[w->present[i] * Q] = x ? x[i] : NAN;
}

/* Columns of species that are neither fed nor made: a first trace of one is another network. */
static void write_absent(const network *w, const mt_slopes *all, int64_t row)
{
    int64_t Q = (int64_t)w->all + 2 + w->laws.parameters;
    double *out = all->slope + row * w->all * Q;
    for (int64_t k = 0; k < w->all * Q; k++)
        out[k] = NAN;
}

static int place_of(const network *w, int column)
{
    if (column < w->species)
        return w->present[column];
    return w->all + 1 + column - w->species;
}

static int all_finite(const double *x, int n)
{
    for (int i = 0; i < n; i++)
        if (!isfinite(x[i]))
            return 0;
    return 1;
}

static void begin(desk *d, const mt_slopes *all, int64_t row, const cut *rule, double *depth, double *feed, double *scale)
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

static void tank_slopes(desk *d, tangents *x, const mt_slopes *all, int64_t row, double *feed, double *c, double *b)
{
    const network *w = d->net;
    int S = w->species, fine = 1;
    double scale, tau = all->tau[row], *keep = d->next, *f = take(d, S), *terms = take(d, S);
    begin(d, all, row, x->l.rule, d->depth_steady, feed, &scale);
    bind_tangents(x);
    for (int i = 0; i < S; i++)
        c[i] = fmax(all->outlet[row * w->all + w->present[i]], STEADY_NOTHING * scale);
    write_absent(w, all, row);
    tank t = {x->l, feed, tau, STEADY_NOTHING * scale};
    tank_matrix(d, &t, c, f, terms, d->matrix);
    gains(d, d->r, b);
    factor_and_solve(d, d->matrix, c, b);
    fine &= all_finite(b, S);
    write_column(w, all, row, w->all, b);
    for (int k = 0; k < x->columns; k++) {
        memset(b, 0, (size_t)S * sizeof *b);
        if (k < S)
            b[k] = 1.0;
        else {
            memset(f, 0, (size_t)S * sizeof *f);
            place(x, c, d->r);
            slope_tangent(x, d->registers, c, f, k, b);
            for (int i = 0; i < S; i++)
                b[i] *= tau;
        }
        solve(d, b);
        fine &= all_finite(b, S);
        write_column(w, all, row, place_of(w, k), b);
    }
    all->status[row] = fine ? MT_OK : MT_NOT_FINITE;
    d->next = keep;
}

static int is_complete(const network *w, const mt_slopes *a)
{
    return a->feed && a->tau && a->T && (a->p || !w->laws.parameters) && a->slope && a->status;
}

int mt_tank_slopes(const mt_network *w, const mt_slopes *all)
{
    desk d;
    tangents x;
    if (!w || !all || all->n < 0 || !is_complete(w, all) || !all->outlet)
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

/* A tube on its way: sensitivities (columns, S), and those of the stages, (columns, 12, S). */
typedef struct {
    tangents x;
    flow f;
    double *s, *stages, *u, *now, *out;
    uint8_t *ended; /* (species) used up: its laws are cut */
} carried;

/* u = c + sum of weights times stages */
static void combine(double *u, const double *c, const double *weights, double h, const double *stages, int count, int S)
{
    for (int i = 0; i < S; i++) {
        double sum = 0.0;
        for (int k = 0; k < count; k++)
            sum += weights[k] * stages[(ptrdiff_t)k * S + i];
        u[i] = c[i] + h * sum;
    }
}

static void carry_explicit(carried *y, const double *c, double h)
{
    desk *d = y->x.d;
    int S = d->net->species;
    for (int k = 0; k < 12; k++) {
        combine(y->u, c, DOP853_A[k], h, d->stages, k, S);
        flow_slope(d, &y->f, y->u, d->stages + (ptrdiff_t)k * S);
        for (int q = 0; q < y->x.columns; q++) {
            double *stages = y->stages + (ptrdiff_t)q * 12 * S;
            combine(y->now, y->s + (ptrdiff_t)q * S, DOP853_A[k], h, stages, k, S);
            slope_tangent(&y->x, d->registers, y->u, y->now, q, stages + (ptrdiff_t)k * S);
        }
    }
    for (int q = 0; q < y->x.columns; q++)
        combine(y->s + (ptrdiff_t)q * S, y->s + (ptrdiff_t)q * S, DOP853_B, h, y->stages + (ptrdiff_t)q * 12 * S, 12, S);
}

/* Where stage k of the Rosenbrock method is evaluated, from c and the stages before it. */
static void stage_point(double *u, const double *c, const double *stages, int k, int S)
{
    combine(u, c, RODAS5P_A[k < 6 ? k : 5], 1.0, stages, k < 6 ? k : 5, S);
    for (int j = 5; j < k; j++)
        for (int i = 0; i < S; i++)
            u[i] += stages[(ptrdiff_t)j * S + i];
}

static void carry_stiff(carried *y, const double *c, double h, const double *least, double *error)
{
    desk *d = y->x.d;
    tangents *x = &y->x;
    int S = d->net->species;
    double per = 1.0 / h;
    /* the step itself once more: it leaves its stages and its factors on the desk */
    METHODS[STIFF].step(d, &y->f, c, h, least, y->u, error, NULL);
    law_rates(d, y->f.cut, c, d->r);
    memcpy(x->base, d->registers, (size_t)d->net->laws.registers * sizeof *x->base);
    for (int k = 0; k < 8; k++) {
        stage_point(y->u, c, d->stages, k, S);
        law_rates(d, y->f.cut, y->u, d->r);
        for (int q = 0; q < x->columns; q++) {
            double *stages = y->stages + (ptrdiff_t)q * 12 * S, *stage = stages + (ptrdiff_t)k * S;
            const double *s = y->s + (ptrdiff_t)q * S;
            stage_point(y->now, s, stages, k, S);
            slope_tangent(x, d->registers, y->u, y->now, q, stage);
            jacobian_tangent(x, x->base, c, s, q, d->stages + (ptrdiff_t)k * S, y->out);
            for (int i = 0; i < S; i++) {
                double sum = 0.0;
                for (int j = 0; j < k; j++)
                    sum += RODAS5P_C[k][j] * stages[(ptrdiff_t)j * S + i];
                stage[i] += y->out[i] + sum * per;
            }
            solve(d, stage);
        }
    }
    for (int q = 0; q < x->columns; q++) {
        double *s = y->s + (ptrdiff_t)q * S;
        stage_point(y->now, s, y->stages + (ptrdiff_t)q * 12 * S, 8, S);
        memcpy(s, y->now, (size_t)S * sizeof *s);
    }
}

/* dc/dt once species i has settled where its laws are cut: as much is taken of it as is supplied. */
static void settled_slope(carried *y, double *c, int i, double top, double *out)
{
    desk *d = y->x.d;
    double before = c[i], low = log(1e-290), high = log(top > 1e-280 ? top : 1e-280);
    for (int k = 0; k < 60; k++) {
        double middle = 0.5 * (low + high);
        c[i] = exp(middle);
        flow_slope(d, &y->f, c, out);
        if (out[i] < 0)
            high = middle;
        else
            low = middle;
    }
    c[i] = before;
}

/* Where a species has just been used up the laws change, and the time at which they do changes with every
 * number: s jumps by (f- - f+) dt*, dt* = -s_i/f_i-, and what is left of the species depends on nothing.
 */
static int cross_ends(carried *y, stepper *s)
{
    desk *d = y->x.d;
    const network *w = d->net;
    const cut *r = &w->moving;
    int S = w->species, crossed = 0;
    for (int k = 0; k < r->n; k++) {
        int i = r->species[k], low = w->ends[i] && s->c[i] < LOW * d->depth_moving[k];
        if (!low || y->ended[i]) {
            y->ended[i] = (uint8_t)low;
            continue;
        }
        y->ended[i] = 1, crossed = 1;
        flow_slope(d, &y->f, s->before, y->u);
        settled_slope(y, s->c, i, s->before[i], y->now);
        for (int q = 0; q < y->x.columns && y->u[i] != 0; q++) {
            double *column = y->s + (ptrdiff_t)q * S, shift = -column[i] / y->u[i];
            for (int m = 0; m < S; m++)
                column[m] += (y->u[m] - y->now[m]) * shift;
            column[i] = 0.0;
        }
    }
    return crossed;
}

static void write_tube(const network *w, const mt_slopes *all, int64_t row, carried *y, int fine)
{
    int S = w->species;
    write_absent(w, all, row);
    for (int q = 0; fine && q < y->x.columns; q++)
        write_column(w, all, row, place_of(w, q), y->s + (ptrdiff_t)q * S);
}

static void tube_slopes(desk *d, carried *y, stepper *s, double *least, double *feed, const mt_slopes *all, int64_t row)
{
    const network *w = d->net;
    int S = w->species;
    double scale, tau = all->tau[row];
    begin(d, all, row, &w->moving, d->depth_moving, feed, &scale);
    bind_tangents(&y->x);
    for (int i = 0; i < S; i++)
        least[i] = ABSOLUTE * scale;
    for (int k = 0; k < w->moving.n; k++)
        if (w->ends[w->moving.species[k]])
            least[w->moving.species[k]] = SHARE_OF_DEPTH * d->depth_moving[k];
    y->f = (flow){{&w->moving, d->depth_moving}, feed, 0.0};
    tolerance o = {{1e-10, 1e-8}, least, scale};
    memset(y->ended, 0, (size_t)S);
    memset(y->s, 0, (size_t)y->x.columns * (size_t)S * sizeof *y->s);
    for (int i = 0; i < S; i++)
        y->s[(ptrdiff_t)i * S + i] = 1.0;
    int most = MOST_CARRIED / y->x.columns;
    stepper_start(d, s, &y->f, &o, NULL, feed, most < MOST_STEPS ? most : MOST_STEPS, EXPLICIT);
    while (s->active && s->t < tau && tau - s->t > 1e-15 * tau) {
        s->h = fmin(s->h, tau - s->t);
        if (!attempt(d, s) || cross_ends(y, s))
            continue; /* a step across an end is as good as none for them: it is short beside all others */
        if (s->last_mode == EXPLICIT)
            carry_explicit(y, s->before, s->stride);
        else
            carry_stiff(y, s->before, s->stride, least, s->error);
    }
    int fine = s->status == MT_OK && all_finite(y->s, y->x.columns * S);
    write_tube(w, all, row, y, fine);
    flow_slope(d, &y->f, s->c, y->out);
    if (fine)
        write_column(w, all, row, w->all, y->out);
    all->status[row] = fine ? MT_OK : s->status != MT_OK ? s->status : MT_NOT_FINITE;
}

int mt_tube_slopes(const mt_network *w, const mt_slopes *all)
{
    desk d;
    carried y;
    stepper s;
    if (!w || !all || all->n < 0 || !is_complete(w, all))
        return MT_BAD_REQUEST;
    int64_t S = w->species, columns = S + 1 + w->laws.parameters;
    if (!desk_open(&d, w, tangent_room(w) + columns * S * 13))
        return MT_NO_MEMORY;
    open_tangents(&y.x, &d, (laws){&w->moving, d.depth_moving});
    y.s = take(&d, columns * S), y.stages = take(&d, columns * S * 12);
    y.ended = (uint8_t *)take(&d, S);
    y.u = take(&d, S), y.now = take(&d, S), y.out = take(&d, S);
    s.c = take(&d, S), s.before = take(&d, S), s.after = take(&d, S), s.error = take(&d, S);
    double *least = take(&d, S), *feed = take(&d, S);
    for (int64_t row = 0; row < all->n; row++)
        tube_slopes(&d, &y, &s, least, feed, all, row);
    desk_close(&d);
    return MT_DONE;
}
