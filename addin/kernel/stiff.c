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

int step_stiff(desk *d, const flow *f, const double *c, double h, const double *least, double *after, double *error,
               double *stiffness)
{
    int S = d->net->species;
    double *stages = d->stages, *u = d->a, *slope = d->a + S, *size = d->b, per = 1.0 / h;
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
    memcpy(u, c, (size_t)S * sizeof *c);
    for (int k = 1; k < 8; k++) {
        double *stage = stages + (ptrdiff_t)k * S;
        if (k < 6) {
            memcpy(u, c, (size_t)S * sizeof *c);
            for (int j = 0; j < k; j++)
                for (int i = 0; i < S; i++)
                    u[i] += RODAS5P_A[k][j] * stages[(ptrdiff_t)j * S + i];
        } else
            for (int i = 0; i < S; i++)
                u[i] += stages[(ptrdiff_t)(k - 1) * S + i];
        flow_slope(d, f, u, slope);
        for (int i = 0; i < S; i++)
            stage[i] = 0.0;
        for (int j = 0; j < k; j++)
            for (int i = 0; i < S; i++)
                stage[i] += RODAS5P_C[k][j] * stages[(ptrdiff_t)j * S + i];
        for (int i = 0; i < S; i++)
            stage[i] = slope[i] + stage[i] * per;
        solve(d, stage);
    }
    for (int i = 0; i < S; i++) {
        error[i] = stages[7 * (ptrdiff_t)S + i];
        after[i] = u[i] + error[i];
    }
    return 1;
}
