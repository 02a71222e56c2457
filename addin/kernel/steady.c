/* Newton's method for a steady tank, 0 = F(c) = feed - c + tau nu' r(c), and how good its answer is.
 *
 * Convergence is judged by relative changes, so that a trace species counts as much as an abundant one (an
 * absolute floor has let half-order species pass unconverged). Concentrations stay positive: a step takes
 * at most nine tenths, and more only of a species that has been losing that much step after step.
 */
#include <string.h>

#include "kernel.h"

#define MOST_FALL 0.1
#define DEEPEST_FALL 1e-16
#define DEEPEST 1e-20 /* of what counts as nothing: where a falling concentration stops */
#define SETTLED 1e-9  /* relative change after which the next, quadratic, one is rounding */
#define STALLED 1e-4  /* rounding may keep an ill-conditioned tank from settling closer */
#define ROUGHLY_CLOSED 1e-8
#define CLOSED 1e-12
#define GOOD 1e-12 /* estimated relative error that needs no second look */
#define SPLITTER 134217729.0 /* 2^27 + 1 */
#define TRACE 1e-20          /* of the largest concentration: a disturbance by species that are absent */
#define ROUNDING 1e-13       /* of a matrix: an eigenvalue smaller than that has no sign */

/* F, the sum of its terms' sizes, and I - tau J. */
void tank_matrix(desk *d, const tank *t, const double *c, double *f, double *terms, double *matrix)
{
    int S = d->net->species;
    law_slopes(d, t->laws, c, d->r, d->v);
    gains(d, d->r, f);
    traffic(d->net, d->r, terms);
    spread_jacobian(d, d->v, matrix);
    for (int i = 0; i < S; i++) {
        double *row = matrix + (ptrdiff_t)i * S;
        f[i] = t->feed[i] - c[i] + t->tau * f[i];
        terms[i] = t->feed[i] + c[i] + t->tau * terms[i];
        for (int j = 0; j < S; j++)
            row[j] *= -t->tau;
        row[i] += 1.0;
    }
}

/* Iterates from c in place; returns whether it settled. */
int newton(desk *d, const tank *t, double *c, int most, int *iterations)
{
    int S = d->net->species, settled = 0, k = 0;
    double *keep = d->next, *f = take(d, S), *terms = take(d, S), *y = take(d, S), *fall = take(d, S);
    for (int i = 0; i < S; i++)
        fall[i] = MOST_FALL;
    for (; k < most && !settled; k++) {
        double change = 0.0, gap = 0.0;
        int lost = 0;
        tank_matrix(d, t, c, f, terms, d->matrix);
        memcpy(y, f, (size_t)S * sizeof *f);
        factor_and_solve(d, d->matrix, c, y);
        for (int i = 0; i < S; i++) {
            double step = y[i] / c[i], now = c[i];
            if (!isfinite(step)) {
                lost = 1;
                break;
            }
            if (now > t->nothing || now * (1.0 + step) > t->nothing) {
                double off = fabs(f[i]) / terms[i];
                change = fabs(step) > change ? fabs(step) : change;
                gap = off > gap ? off : gap;
            }
            int falls = !(step > MOST_FALL - 1.0);
            double next = now * (falls ? fall[i] : 1.0 + step);
            c[i] = next > DEEPEST * t->nothing ? next : DEEPEST * t->nothing;
            fall[i] = falls ? fmax(fall[i] * fall[i], DEEPEST_FALL) : MOST_FALL;
        }
        if (lost) {
            k++;
            break;
        }
        settled = (change <= SETTLED && gap <= ROUGHLY_CLOSED) || (change <= STALLED && gap <= CLOSED && k >= 8);
    }
    *iterations += k;
    d->next = keep;
    return settled;
}

/* Knuth's two-sum, and Dekker's product (Numer. Math. 18 (1971) 224): value and what it lost. */
static double two_sum(double a, double b, double *lost)
{
    volatile double s = a + b, t = s - a, u = s - t;
    *lost = (a - u) + (b - t);
    return s;
}

static double product_error(double a, double b, double product)
{
    volatile double ta = SPLITTER * a, ah = ta - (ta - a), al = a - ah;
    volatile double tb = SPLITTER * b, bh = tb - (tb - b), bl = b - bh;
    double error = ((ah * bh - product) + ah * bl + al * bh) + al * bl;
    return isfinite(error) ? error : 0.0;
}

/* F with sums in twice the digits, from rates r: where fast reactions almost cancel, their rounding hides
 * the slow ones. */
static void exact_balance(const network *w, const tank *t, const double *c, const double *r, double *f, double *rest)
{
    for (int i = 0; i < w->species; i++)
        f[i] = two_sum(t->feed[i], -c[i], &rest[i]);
    for (int m = 0; m < w->laws.terms; m++) {
        int j = w->owner[m];
        double extent = t->tau * r[m];
        for (int k = w->gain_start[j]; k < w->gain_start[j + 1]; k++) {
            int i = w->gain_species[k];
            double gain = w->sign[m] * w->gain[k], part = extent * gain, more;
            f[i] = two_sum(f[i], part, &more);
            rest[i] += more + product_error(extent, gain, part) + extent * (w->sign[m] * w->finer[k]);
        }
    }
    for (int i = 0; i < w->species; i++)
        f[i] += rest[i];
}

/* Newton's method with such sums; c, residual and the last relative change. */
static void twice_the_digits(desk *d, const tank *t, double *c, const uint8_t *gone, double *residual, double *last)
{
    const network *w = d->net;
    int S = w->species;
    double *keep = d->next, *f = take(d, S), *terms = take(d, S), *rough = take(d, S), *y = take(d, S);
    *last = *residual = INFINITY;
    for (int round = 0; round < 6; round++) {
        double change = 0.0, gap = 0.0;
        tank_matrix(d, t, c, rough, terms, d->matrix);
        exact_balance(w, t, c, d->r, f, rough);
        memcpy(y, f, (size_t)S * sizeof *f);
        factor_and_solve(d, d->matrix, c, y);
        for (int i = 0; i < S; i++) {
            y[i] /= c[i];
            double off = fabs(f[i]) / terms[i];
            if (!(c[i] > t->nothing) || gone[i])
                off *= 0.0, change += 0.0 * y[i];
            else
                change = fabs(y[i]) > change || y[i] != y[i] ? fabs(y[i]) : change;
            gap = off > gap || off != off ? off : gap;
        }
        if (!(change < *last))
            break;
        *last = change, *residual = gap;
        for (int i = 0; i < S; i++)
            if (y[i] > -0.5)
                c[i] *= 1.0 + y[i];
        if (change <= EPSILON)
            break;
    }
    d->next = keep;
}

/* Improves a root until rounding no longer shows, and tells how far it can be trusted.
 *
 * residual: largest |F| over the sum of its terms; condition: largest relative change of an outlet per
 * relative change of feed and rates; error: estimated relative error. What is `gone` has no digits to lose.
 * Returns whether the matrix on the desk is still that of c.
 */
int polish(desk *d, const tank *t, double *c, const uint8_t *gone, double *residual, double *condition, double *error)
{
    const network *w = d->net;
    int S = w->species;
    double *keep = d->next, *f = take(d, S), *terms = take(d, S), *x = take(d, S), *sway = take(d, S);
    double *loss = take(d, S), *inverse = d->jacobian; /* row j: the solution for unit vector j */
    *residual = *condition = *error = 0.0;
    tank_matrix(d, t, c, f, terms, d->matrix);
    memcpy(x, f, (size_t)S * sizeof *x);
    factor_and_solve(d, d->matrix, c, x);
    for (int i = 0; i < S; i++)
        loss[i] = sway[i] = 0.0;
    for (int j = 0; j < S; j++) {
        double *column = inverse + (ptrdiff_t)j * S;
        memset(column, 0, (size_t)S * sizeof *column);
        column[j] = 1.0;
        solve(d, column);
        for (int i = 0; i < S; i++) {
            double size = fabs(column[i]);
            loss[i] += size * terms[j];
            sway[i] += size * t->feed[j];
        }
    }
    for (int m = 0; m < w->laws.terms; m++) {
        int n = w->owner[m];
        double extent = t->tau * fabs(d->r[m]);
        for (int i = 0; i < S; i++)
            x[i] = 0.0;
        for (int k = w->gain_start[n]; k < w->gain_start[n + 1]; k++) {
            const double *column = inverse + (ptrdiff_t)w->gain_species[k] * S;
            for (int i = 0; i < S; i++)
                x[i] += column[i] * w->gain[k];
        }
        for (int i = 0; i < S; i++)
            sway[i] += fabs(x[i]) * extent;
    }
    for (int i = 0; i < S; i++) {
        int there = c[i] > t->nothing && !gone[i];
        double e = EPSILON * loss[i] / c[i], s = sway[i] / c[i], g = fabs(f[i]) / terms[i];
        if (!there)
            e *= 0.0, s *= 0.0, g *= 0.0; /* nan stays nan */
        *error = e > *error || e != e ? e : *error;
        *condition = s > *condition || s != s ? s : *condition;
        *residual = g > *residual || g != g ? g : *residual;
    }
    d->next = keep;
    int rough = !(*error <= GOOD);
    if (rough) {
        double last;
        twice_the_digits(d, t, c, gone, residual, &last);
        double least = EPSILON * *condition;
        *error = last > least || last != last ? last : least;
        if (*condition != *condition)
            *error = *condition;
    }
    return !rough;
}

/* The short way for a root that needs no polish: stable by proof, and its error bounded by the same matrix.
 *
 * Returns 0, and says nothing, where the proof fails or rounding shows; then `polish` and `growth` decide.
 */
int vouch(desk *d, const tank *t, const double *c, const uint8_t *gone, double *residual, double *error)
{
    int S = d->net->species, fine;
    double *keep = d->next, *f = take(d, S), *terms = take(d, S), *loss = take(d, S), worst = 0.0, gap = 0.0;
    tank_matrix(d, t, c, f, terms, d->matrix);
    fine = is_m_matrix(d, d->matrix);
    if (fine) {
        memcpy(loss, terms, (size_t)S * sizeof *terms);
        solve(d, loss);
        for (int i = 0; i < S; i++) {
            if (!(c[i] > t->nothing) || gone[i])
                continue;
            double e = EPSILON * fabs(loss[i]) / c[i], g = fabs(f[i]) / terms[i];
            worst = e > worst || e != e ? e : worst;
            gap = g > gap || g != g ? g : gap;
        }
        fine = worst <= GOOD && gap <= CLOSED;
        *residual = gap, *error = worst;
    }
    d->next = keep;
    return fine;
}

/* Does a disturbance of the steady state c grow? known: its matrix is on the desk; rate: the fastest one's, 1/s, -inf where all are proven to
 * fade; swing: its frequency; unstable: it surely grows. */
void growth(desk *d, const tank *t, const double *c, int known, double *rate, double *swing, int *unstable)
{
    int S = d->net->species;
    double *keep = d->next, *f = take(d, S), *terms = take(d, S), largest = 0.0;
    *rate = -INFINITY, *swing = 0.0, *unstable = 0;
    if (!known)
        tank_matrix(d, t, c, f, terms, d->matrix);
    d->next = keep;
    if (is_m_matrix(d, d->matrix))
        return;
    spread_jacobian(d, d->v, d->jacobian);
    for (int i = 0; i < S; i++)
        for (int j = 0; j < S; j++) {
            double *x = d->jacobian + (ptrdiff_t)i * S + j;
            *x *= c[j] / c[i];
            largest = fabs(*x) > largest ? fabs(*x) : largest;
        }
    double top, per = 1.0 / t->tau;
    if (!rightmost(d->jacobian, S, &top, swing)) {
        *rate = NAN;
        return;
    }
    *rate = top - per;
    *unstable = *rate > ROUNDING * largest + 1e-9 * per;
}

/* True where a trace of the absent species would grow: the state without them is no resting place. */
int invaded(desk *d, double T, const double *p, const double *c, double tau)
{
    const network *w = d->net;
    const program *q = &w->whole;
    int n = w->absent;
    if (!w->has_whole || !n)
        return 0;
    double *g = d->whole_registers, *adjoints = g + q->registers, *m = adjoints + q->registers;
    double largest = 0.0, top, swing, per = 1.0 / tau;
    bind_case(q, g, T, p);
    for (int i = 0; i < w->species; i++) {
        largest = c[i] > largest ? c[i] : largest;
        g[w->present[i]] = c[i];
    }
    for (int k = 0; k < n; k++)
        g[w->absent_species[k]] = TRACE * (largest > 0 ? largest : 1.0);
    run(q, q->prelude, q->prelude + q->body, g, 0);
    memset(m, 0, (size_t)n * (size_t)n * sizeof *m);
    for (int t = 0; t < q->terms; t++) {
        if (w->held[t])
            continue;
        reverse(q, t, g, adjoints);
        for (int e = q->entry_start[t]; e < q->entry_start[t + 1]; e++)
            for (int b = 0; b < n; b++)
                if (q->entry_read[e] && w->absent_species[b] == q->entry_leaf[e])
                    for (int a = 0; a < n; a++) {
                        double gain = w->whole_gain[(ptrdiff_t)t * n + a];
                        if (gain != 0)
                            m[a * n + b] += gain * adjoints[q->entry_leaf[e]];
                    }
    }
    largest = 0.0;
    for (int k = 0; k < n * n; k++)
        largest = fabs(m[k]) > largest ? fabs(m[k]) : largest;
    return rightmost(m, n, &top, &swing) && top - per > ROUNDING * largest + 1e-9 * per;
}
