/* Totals that no reaction changes: integrators keep them but for the rounding of fast reactions. */
#include "kernel.h"

/* Of a total's terms: more than this is no rounding and must show. */
#define DRIFT 1e-4
#define ROUNDED 1.2e-16 /* of the terms: no double is nearer */
#define DEPENDENT 1e-12 /* a total that the others determine */

static double weigh(const double *weights, const double *c, int n)
{
    double out = 0.0;
    for (int i = 0; i < n; i++)
        out += weights[i] * c[i];
    return out;
}

/* first and last: (n_totals) each, memory of the caller's choice. */
void totals_of(desk *d, totals *t, const double *start, const double *feed, double exchange)
{
    const network *w = d->net;
    t->net = w;
    t->exchange = exchange;
    for (int k = 0; k < w->n_totals; k++) {
        t->first[k] = weigh(w->totals + (ptrdiff_t)k * w->species, start, w->species);
        t->last[k] = weigh(w->totals + (ptrdiff_t)k * w->species, feed, w->species);
    }
}

/* Solves gram x = off for a positive semidefinite gram (n, n), scaled to a unit diagonal, in place.
 *
 * Cholesky with pivoting; what is left of a dependent total's row is rounding and counts as zero.
 */
static void least_squares(double *gram, double *off, double *size, int *done, int n)
{
    for (int k = 0; k < n; k++) {
        size[k] = gram[k * n + k] > 0 ? sqrt(gram[k * n + k]) : 1.0;
        off[k] /= size[k];
        done[k] = -1;
    }
    for (int i = 0; i < n; i++)
        for (int j = 0; j < n; j++)
            gram[i * n + j] /= size[i] * size[j];
    int rank = 0;
    for (; rank < n; rank++) { /* Gauss-Jordan on the best diagonal that is left */
        int best = -1;
        for (int k = 0; k < n; k++)
            if (done[k] < 0 && (best < 0 || gram[k * n + k] > gram[best * n + best]))
                best = k;
        double pivot = gram[best * n + best];
        if (!(pivot > DEPENDENT))
            break;
        done[best] = rank;
        for (int i = 0; i < n; i++) {
            if (i == best)
                continue;
            double share = gram[i * n + best] / pivot;
            for (int j = 0; j < n; j++)
                gram[i * n + j] -= share * gram[best * n + j];
            off[i] -= share * off[best];
        }
    }
    for (int k = 0; k < n; k++)
        off[k] = done[k] < 0 ? 0.0 : off[k] / gram[k * n + k] / size[k];
}

/* Moves c at a time back onto its totals, least relative to the concentrations. */
void restore(desk *d, const totals *t, double *c, double time)
{
    const network *w = t->net;
    int n = w->n_totals, S = w->species, needed = 0;
    if (!n)
        return;
    double *keep = d->next, fade = t->exchange > 0 ? exp(-time * t->exchange) : 1.0, largest = 0.0;
    double *off = take(d, n), *size = take(d, n), *gram = take(d, (int64_t)n * n);
    int *done = (int *)take(d, n);
    int near = 1;
    for (int k = 0; k < n; k++) {
        const double *row = w->totals + (ptrdiff_t)k * S;
        double sum = 0.0, now = 0.0, terms = 0.0;
        sum = t->last[k] + fade * (t->first[k] - t->last[k]);
        for (int i = 0; i < S; i++) {
            now += row[i] * c[i];
            terms += fabs(row[i] * c[i]);
        }
        off[k] = sum - now;
        needed |= fabs(off[k]) > ROUNDED * terms;
        near &= fabs(off[k]) <= DRIFT * terms;
    }
    for (int i = 0; i < S; i++)
        largest = fabs(c[i]) > largest ? fabs(c[i]) : largest;
    if (near && needed && largest > 0) {
        for (int k = 0; k < n; k++)
            for (int m = 0; m < n; m++) {
                double sum = 0.0;
                for (int i = 0; i < S; i++) {
                    double share = c[i] / largest;
                    sum += w->totals[(ptrdiff_t)k * S + i] * w->totals[(ptrdiff_t)m * S + i] * share * share;
                }
                gram[k * n + m] = sum;
            }
        least_squares(gram, off, size, done, n);
        double *moved = take(d, S);
        int fine = 1;
        for (int i = 0; i < S; i++) {
            double push = 0.0, share = c[i] / largest;
            for (int k = 0; k < n; k++)
                push += off[k] * w->totals[(ptrdiff_t)k * S + i];
            moved[i] = c[i] + push * share * share;
            fine &= isfinite(moved[i]) != 0;
        }
        for (int i = 0; fine && i < S; i++)
            c[i] = moved[i];
    }
    d->next = keep;
}
