/* DOP853: an explicit Runge-Kutta method of order 8 by Dormand and Prince, errors by orders 5 and 3.
 *
 * E. Hairer, S. P. Norsett, G. Wanner, Solving Ordinary Differential Equations I, 2nd ed. 1993, section II.5
 * (coefficients) and II.10 (error estimate). The tests check the order conditions of this very table, read
 * from this file, and that it is the reference engine's.
 */
#include <string.h>

#include "kernel.h"
#include "tables.h"

/* y = c + h sum weights_i stages_i */
static void mix(double *y, const double *c, double h, const double *weights, int count, const double *stages, int S)
{
    for (int i = 0; i < S; i++)
        y[i] = 0.0;
    for (int k = 0; k < count; k++)
        if (weights[k] != 0.0)
            for (int i = 0; i < S; i++)
                y[i] += weights[k] * stages[(ptrdiff_t)k * S + i];
    for (int i = 0; i < S; i++)
        y[i] = (c ? c[i] : 0.0) + h * y[i];
}

/* One step of size h from c: the new state, its error, and |h lambda| of the largest eigenvalue. */
int step_explicit(desk *d, const flow *f, const double *c, double h, const double *least, double *after,
                  double *error, double *stiffness)
{
    int S = d->net->species;
    double *stages = d->stages, *u = d->a, *third = d->b, *last = d->b + S, moved = 0.0, turned = 0.0;
    flow_slope(d, f, c, stages);
    for (int k = 1; k < 12; k++) {
        mix(u, c, h, DOP853_A[k], k, stages, S);
        flow_slope(d, f, u, stages + (ptrdiff_t)k * S);
    }
    mix(after, c, h, DOP853_B, 12, stages, S);
    mix(error, NULL, h, DOP853_E5, 12, stages, S);
    mix(third, NULL, h, DOP853_E3, 12, stages, S);
    if (stiffness)
        flow_slope(d, f, after, last);
    for (int i = 0; i < S; i++) {
        double length = sqrt(error[i] * error[i] + 0.01 * third[i] * third[i]), shrink = fabs(error[i]) / length;
        error[i] *= isfinite(shrink) ? shrink : (error[i] != error[i] ? NAN : 0.0);
        if (stiffness) {
            double size = fabs(after[i]) + fabs(c[i]) + least[i];
            double change = fabs((last[i] - stages[11 * (ptrdiff_t)S + i]) / size), way = fabs((after[i] - u[i]) / size);
            turned = change > turned || change != change ? change : turned;
            moved = way > moved || way != way ? way : moved;
        }
    }
    if (stiffness) {
        double ratio = turned / moved;
        *stiffness = h * (isfinite(ratio) ? ratio : 0.0);
    }
    return 1;
}
