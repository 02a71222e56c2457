/* Rodas5P: a Rosenbrock method of order 5 for stiff equations, L-stable, with an embedded order 4.
 *
 * For autonomous equations c' = f(c), in the form that needs no product with the Jacobian J:
 *
 *     (I/(gamma h) - J) K_i = f(c + sum_j a_ij K_j) + sum_j c_ij K_j / h,   i = 1..8
 *
 * the last three stages building on one another: u_7 = u_6 + K_6, u_8 = u_7 + K_7, c_1 = u_8 + K_8, and
 * K_8 is the error estimate. G. Steinebach, BIT Numer. Math. 63 (2023) 27, table of Rodas5P; the tests
 * check the order conditions of this very table.
 */
#include <string.h>

#include "kernel.h"
#include "tables.h"

#define NOTHING 1e-10 /* of the least concentration: a species at zero is measured by what a step makes */

#define K(j) stages[(j) * (ptrdiff_t)S + i]
#define A(k, j) RODAS5P_A[k][j] * K(j)
#define C(k, j) RODAS5P_C[k][j] * K(j)
#define STAGE(k, point, sum)                                                                                         \
    do {                                                                                                             \
        double *stage = stages + (k) * (ptrdiff_t)S;                                                                 \
        for (int i = 0; i < S; i++)                                                                                  \
            u[i] = (point), stage[i] = (sum);                                                                        \
        flow_slope(d, f, u, slope);                                                                                  \
        for (int i = 0; i < S; i++)                                                                                  \
            stage[i] = slope[i] + stage[i] * per;                                                                    \
        solve(d, stage);                                                                                             \
    } while (0)

int step_stiff(desk *d, const flow *f, const double *restrict c, double h, const double *least,
               double *restrict after, double *restrict error, double *stiffness)
{
    int S = d->net->species;
    double *restrict stages = d->stages, *restrict u = d->a, *restrict slope = d->a + S, *size = d->b, per = 1.0 / h;
    (void)stiffness; /* it does not matter here */
    flow_linear(d, f, c, slope, d->matrix);
    for (int i = 0; i < S * S; i++)
        d->matrix[i] = -d->matrix[i];
    for (int i = 0; i < S; i++) {
        double there = fabs(c[i]), nothing = NOTHING * least[i], made = h * fabs(slope[i]);
        d->matrix[(ptrdiff_t)i * S + i] += per / RODAS5P_GAMMA;
        size[i] = there > nothing ? there : (made > nothing ? made : nothing);
    }
    memcpy(stages, slope, (size_t)S * sizeof *slope);
    factor_and_solve(d, d->matrix, size, stages);
    STAGE(1, c[i] + A(1, 0), C(1, 0));
    STAGE(2, c[i] + A(2, 0) + A(2, 1), C(2, 0) + C(2, 1));
    STAGE(3, c[i] + A(3, 0) + A(3, 1) + A(3, 2), C(3, 0) + C(3, 1) + C(3, 2));
    STAGE(4, c[i] + A(4, 0) + A(4, 1) + A(4, 2) + A(4, 3), C(4, 0) + C(4, 1) + C(4, 2) + C(4, 3));
    STAGE(5, c[i] + A(5, 0) + A(5, 1) + A(5, 2) + A(5, 3) + A(5, 4),
          C(5, 0) + C(5, 1) + C(5, 2) + C(5, 3) + C(5, 4));
    STAGE(6, u[i] + K(5), C(6, 0) + C(6, 1) + C(6, 2) + C(6, 3) + C(6, 4) + C(6, 5));
    STAGE(7, u[i] + K(6), C(7, 0) + C(7, 1) + C(7, 2) + C(7, 3) + C(7, 4) + C(7, 5) + C(7, 6));
    for (int i = 0; i < S; i++) {
        error[i] = K(7);
        after[i] = u[i] + error[i];
    }
    return 1;
}
