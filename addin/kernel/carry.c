/* Derivatives of tubes, carried along their steps.
 *
 * Each step of the method is differentiated itself, so that they belong to the very numbers that the method
 * gives. For the Rosenbrock method that takes second derivatives of the laws in two directions, which the
 * register machine gives as well (program.c); differences of runs were weighed and left: they lose half the
 * digits.
 */
#include <string.h>

#include "slopes.h"
#include "tables.h"

#define MOST_STEPS 12000
#define MOST_CARRIED 400000 /* columns times steps: a step costs as much per column as two steps of the tube */
#define ABSOLUTE 1e-25
#define SHARE_OF_DEPTH 0.1
#define LOW 1e6

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
        write_column(w, all, row, column_place(w, q), y->s + (ptrdiff_t)q * S);
}

static void tube_slopes(desk *d, carried *y, stepper *s, double *least, double *feed, const mt_slopes *all, int64_t row)
{
    const network *w = d->net;
    int S = w->species;
    double scale, tau = all->tau[row];
    begin_slopes(d, all, row, &w->moving, d->depth_moving, feed, &scale);
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
    int fine = s->status == MT_OK && are_finite(y->s, y->x.columns * S);
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
    if (!w || !all || all->n < 0 || !slopes_complete(w, all))
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
