/* DOP853: an explicit Runge-Kutta method of order 8 by Dormand and Prince, errors by orders 5 and 3.
 *
 * E. Hairer, S. P. Norsett, G. Wanner, Solving Ordinary Differential Equations I, 2nd ed. 1993, section II.5
 * (coefficients) and II.10 (error estimate). The tests check the order conditions of this very table
 * (tables.h), and that it is the reference engine's. Stages are written out: the zeros of the table cost
 * nothing then, and its constants are known to the compiler.
 */
#include <string.h>

#include "kernel.h"
#include "tables.h"

#define K(j) stages[(j) * (ptrdiff_t)S + i]
#define A(k, j) DOP853_A[k][j] * K(j)
#define B(j) DOP853_B[j] * K(j)
#define E5(j) DOP853_E5[j] * K(j)
#define E3(j) DOP853_E3[j] * K(j)
#define STAGE(k, sum)                                                                                                \
    do {                                                                                                             \
        for (int i = 0; i < S; i++)                                                                                  \
            u[i] = c[i] + h * (sum);                                                                                 \
        flow_slope(d, f, u, stages + (k) * (ptrdiff_t)S);                                                            \
    } while (0)

/* The slope at c: mostly it is known from the end of the step before. */
static void first_slope(desk *d, const flow *f, const double *c, double *out)
{
    size_t size = (size_t)d->net->species * sizeof *c;
    if (d->known && !memcmp(c, d->known_at, size))
        memcpy(out, d->known_slope, size);
    else
        flow_slope(d, f, c, out);
}

/* One step of size h from c: the new state, its error, and |h lambda| of the largest eigenvalue. */
int step_explicit(desk *d, const flow *f, const double *restrict c, double h, const double *least,
                  double *restrict after, double *restrict error, double *stiffness)
{
    int S = d->net->species;
    double *restrict stages = d->stages, *restrict u = d->a, moved = 0.0, turned = 0.0;
    first_slope(d, f, c, stages);
    STAGE(1, A(1, 0));
    STAGE(2, A(2, 0) + A(2, 1));
    STAGE(3, A(3, 0) + A(3, 2));
    STAGE(4, A(4, 0) + A(4, 2) + A(4, 3));
    STAGE(5, A(5, 0) + A(5, 3) + A(5, 4));
    STAGE(6, A(6, 0) + A(6, 3) + A(6, 4) + A(6, 5));
    STAGE(7, A(7, 0) + A(7, 3) + A(7, 4) + A(7, 5) + A(7, 6));
    STAGE(8, A(8, 0) + A(8, 3) + A(8, 4) + A(8, 5) + A(8, 6) + A(8, 7));
    STAGE(9, A(9, 0) + A(9, 3) + A(9, 4) + A(9, 5) + A(9, 6) + A(9, 7) + A(9, 8));
    STAGE(10, A(10, 0) + A(10, 3) + A(10, 4) + A(10, 5) + A(10, 6) + A(10, 7) + A(10, 8) + A(10, 9));
    STAGE(11, A(11, 0) + A(11, 3) + A(11, 4) + A(11, 5) + A(11, 6) + A(11, 7) + A(11, 8) + A(11, 9) + A(11, 10));
    for (int i = 0; i < S; i++) {
        after[i] = c[i] + h * (B(0) + B(5) + B(6) + B(7) + B(8) + B(9) + B(10) + B(11));
        double fifth = h * (E5(0) + E5(5) + E5(6) + E5(7) + E5(8) + E5(9) + E5(10) + E5(11));
        double third = h * (E3(0) + E3(5) + E3(6) + E3(7) + E3(8) + E3(9) + E3(10) + E3(11));
        double shrink = fabs(fifth) / sqrt(fifth * fifth + 0.01 * third * third);
        error[i] = isfinite(shrink) ? fifth * shrink : fifth != fifth ? NAN : 0.0;
    }
    if (!stiffness)
        return 1;
    flow_slope(d, f, after, d->known_slope);
    memcpy(d->known_at, after, (size_t)S * sizeof *after);
    d->known = 1;
    for (int i = 0; i < S; i++) {
        double size = fabs(after[i]) + fabs(c[i]) + least[i];
        double change = fabs((d->known_slope[i] - K(11)) / size), way = fabs((after[i] - u[i]) / size);
        turned = change > turned || change != change ? change : turned;
        moved = way > moved || way != way ? way : moved;
    }
    double ratio = turned / moved;
    *stiffness = h * (isfinite(ratio) ? ratio : 0.0);
    return 1;
}
