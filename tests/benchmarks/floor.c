/* The floor: single networks written out by hand, solved by the kernel's methods and nothing around them.
 *
 * One network per compilation (-DP1, -DP2, -DLH, -DROBER): rates, Jacobian and elimination are straight code
 * on constants. Methods, tolerances, stopping rule and step control are the kernel's (steady.c, stepper.c),
 * its tables of coefficients too. What is left out is what a sheet needs: laws cut near zero, pivoting, choice
 * of the method, totals, checks of the answer, statuses, several points along a tube.
 */
#include <math.h>
#include <stdint.h>
#include <string.h>

#include "tables.h"

#define SETTLED 1e-9
#define ROUGHLY_CLOSED 1e-8
#define MOST_FALL 0.1
#define SAFETY 0.9
#define MOST_SHRINK 0.1
#define LEAST 1e-25 /* of the largest concentration */
#define EACH for (int i = 0; i < S; i++)

/* rates: dc/dt; gross: the sum of the sizes of its terms; jacobian; matrix_solve: b becomes m^-1 b, where m is
 * `diagonal` I - `factor` J; the factors are kept in m. */
#if defined(P1)
#define S 4
static inline void rates(const double *c, double *f, double *gross)
{
    double root = sqrt(c[1]), r = 0.8 * c[0] * root, q = 0.3 * c[2] * root;
    f[0] = -r, f[1] = -r - q, f[2] = r - q, f[3] = q;
    gross[0] = r, gross[1] = r + q, gross[2] = r + q, gross[3] = q;
}
static inline void jacobian(const double *c, double j[S][S])
{
    double root = sqrt(c[1]), half = 0.5 / root;
    double ra = 0.8 * root, rb = 0.8 * c[0] * half, qc = 0.3 * root, qb = 0.3 * c[2] * half;
    j[0][0] = -ra, j[0][1] = -rb, j[0][2] = 0;
    j[1][0] = -ra, j[1][1] = -rb - qb, j[1][2] = -qc;
    j[2][0] = ra, j[2][1] = rb - qb, j[2][2] = -qc;
    j[3][0] = 0, j[3][1] = qb, j[3][2] = qc;
}
#define CORE 3 /* species that the others follow */
#elif defined(P2)
#define S 4
static inline void rates(const double *c, double *f, double *gross)
{
    double r = 0.5 * c[0], q = 0.2 * c[1], s = 0.1 * c[0] * c[0];
    f[0] = -r - 2 * s, f[1] = r - q, f[2] = q, f[3] = s;
    gross[0] = r + 2 * s, gross[1] = r + q, gross[2] = q, gross[3] = s;
}
static inline void jacobian(const double *c, double j[S][S])
{
    j[0][0] = -0.5 - 0.4 * c[0];
    j[1][0] = 0.5, j[1][1] = -0.2;
    j[2][0] = 0, j[2][1] = 0.2;
    j[3][0] = 0.2 * c[0], j[3][1] = 0;
}
#define CORE 2
#define TRIANGULAR
#elif defined(LH)
#define S 3
static inline void rates(const double *c, double *f, double *gross)
{
    double under = 1 + 1.5 * c[0] + 0.7 * c[2], r = 2 * c[0] * c[1] / (under * under);
    f[0] = f[1] = -r, f[2] = r;
    gross[0] = gross[1] = gross[2] = r;
}
static inline void jacobian(const double *c, double j[S][S])
{
    double per = 1 / (1 + 1.5 * c[0] + 0.7 * c[2]), square = 2 * per * per, r = c[0] * c[1] * square;
    double a = c[1] * square - 3 * r * per, b = c[0] * square, d = -1.4 * r * per;
    j[0][0] = j[1][0] = -a, j[0][1] = j[1][1] = -b, j[0][2] = j[1][2] = -d;
    j[2][0] = a, j[2][1] = b, j[2][2] = d;
}
#define CORE 3
#elif defined(ROBER)
#define S 3
static inline void rates(const double *c, double *f, double *gross)
{
    double r = 0.04 * c[0], q = 3e7 * c[1] * c[1], s = 1e4 * c[1] * c[2];
    f[0] = s - r, f[1] = r - q - s, f[2] = q;
    gross[0] = r + s, gross[1] = r + q + s, gross[2] = q;
}
static inline void jacobian(const double *c, double j[S][S])
{
    double q = 6e7 * c[1], sb = 1e4 * c[2], sc = 1e4 * c[1];
    j[0][0] = -0.04, j[0][1] = sb, j[0][2] = sc;
    j[1][0] = 0.04, j[1][1] = -q - sb, j[1][2] = -sc;
    j[2][0] = 0, j[2][1] = q, j[2][2] = 0;
}
#define CORE 3
#define STIFF_FROM 5e-3 /* s: B has come to rest on its supply */
#endif

/* m = diagonal I - factor J, factored; species from CORE on only follow and have the diagonal alone. */
static inline void factored(const double *c, double diagonal, double factor, double m[S][S], double *per)
{
    jacobian(c, m);
    EACH
    {
        for (int j = 0; j < CORE; j++)
            m[i][j] *= -factor;
        if (i < CORE)
            m[i][i] += diagonal;
    }
#ifdef TRIANGULAR
    per[0] = 1 / m[0][0], per[1] = 1 / m[1][1];
#else
    per[0] = 1 / m[0][0];
    m[1][0] *= per[0], m[2][0] *= per[0];
    m[1][1] -= m[1][0] * m[0][1], m[1][2] -= m[1][0] * m[0][2];
    m[2][1] -= m[2][0] * m[0][1], m[2][2] -= m[2][0] * m[0][2];
    per[1] = 1 / m[1][1];
    m[2][1] *= per[1];
    m[2][2] -= m[2][1] * m[1][2];
    per[2] = 1 / m[2][2];
#endif
    for (int i = CORE; i < S; i++)
        per[i] = 1 / diagonal;
}

static inline void solved(double m[S][S], const double *per, double *b)
{
#ifdef TRIANGULAR
    b[0] *= per[0];
    b[1] = (b[1] - m[1][0] * b[0]) * per[1];
#else
    b[1] -= m[1][0] * b[0];
    b[2] = (b[2] - m[2][0] * b[0] - m[2][1] * b[1]) * per[2];
    b[1] = (b[1] - m[1][2] * b[2]) * per[1];
    b[0] = (b[0] - m[0][1] * b[1] - m[0][2] * b[2]) * per[0];
#endif
    for (int i = CORE; i < S; i++) {
        for (int j = 0; j < CORE; j++)
            b[i] -= m[i][j] * b[j];
        b[i] *= per[i];
    }
}

static int newton(const double *feed, double tau, double *c)
{
    for (int k = 1; k <= 60; k++) {
        double f[S], gross[S], m[S][S], per[S], y[S], change = 0, gap = 0;
        rates(c, f, gross);
        factored(c, 1.0, tau, m, per);
        EACH f[i] = y[i] = feed[i] - c[i] + tau * f[i];
        solved(m, per, y);
        EACH
        {
            double step = y[i] / c[i], off = fabs(f[i]) / (feed[i] + c[i] + tau * gross[i]);
            change = fabs(step) > change ? fabs(step) : change;
            gap = off > gap ? off : gap;
            c[i] *= step > MOST_FALL - 1 ? 1 + step : MOST_FALL;
        }
        if (change <= SETTLED && gap <= ROUGHLY_CLOSED)
            return k;
    }
    return 0;
}

/* n tanks; c holds first guesses. Returns the sum of all iterations. */
int64_t floor_tanks(int64_t n, const double *feed, const double *tau, double *c)
{
    int64_t iterations = 0;
    for (int64_t row = 0; row < n; row++)
        iterations += newton(feed + row * S, tau[row], c + row * S);
    return iterations;
}

static inline void slope(const double *c, double *f)
{
    double gross[S];
    rates(c, f, gross);
}

#define K(j) k[j][i]
#define A(r, j) DOP853_A[r][j] * K(j)
#define B(j) DOP853_B[j] * K(j)
#define E5(j) DOP853_E5[j] * K(j)
#define E3(j) DOP853_E3[j] * K(j)
#define STAGE(r, sum)                                                                                                \
    do {                                                                                                             \
        EACH u[i] = c[i] + h * (sum);                                                                                \
        slope(u, k[r]);                                                                                              \
    } while (0)

/* DOP853. `first` is the slope at c, and that at `after` on return. */
static inline void step_explicit(const double *c, double h, double *first, double *after, double *error)
{
    double k[12][S], u[S];
    memcpy(k[0], first, sizeof k[0]);
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
    EACH
    {
        after[i] = c[i] + h * (B(0) + B(5) + B(6) + B(7) + B(8) + B(9) + B(10) + B(11));
        double fifth = h * (E5(0) + E5(5) + E5(6) + E5(7) + E5(8) + E5(9) + E5(10) + E5(11));
        double third = h * (E3(0) + E3(5) + E3(6) + E3(7) + E3(8) + E3(9) + E3(10) + E3(11));
        double length = sqrt(fifth * fifth + 0.01 * third * third);
        error[i] = length != 0 ? fifth * fabs(fifth) / length : 0.0;
    }
    slope(after, first);
}

#ifdef STIFF_FROM
#undef A
#undef STAGE
#define A(r, j) RODAS5P_A[r][j] * K(j)
#define C(r, j) RODAS5P_C[r][j] * K(j)
#define STAGE(r, point, sum)                                                                                         \
    do {                                                                                                             \
        EACH u[i] = (point), k[r][i] = (sum);                                                                        \
        slope(u, f);                                                                                                 \
        EACH k[r][i] = f[i] + k[r][i] * per_h;                                                                       \
        solved(m, per, k[r]);                                                                                        \
    } while (0)

/* Rodas5P. */
static inline void step_stiff(const double *c, double h, double *first, double *after, double *error)
{
    double k[8][S], u[S], f[S], m[S][S], per[S], per_h = 1 / h;
    factored(c, per_h / RODAS5P_GAMMA, 1.0, m, per);
    memcpy(k[0], first, sizeof k[0]);
    solved(m, per, k[0]);
    STAGE(1, c[i] + A(1, 0), C(1, 0));
    STAGE(2, c[i] + A(2, 0) + A(2, 1), C(2, 0) + C(2, 1));
    STAGE(3, c[i] + A(3, 0) + A(3, 1) + A(3, 2), C(3, 0) + C(3, 1) + C(3, 2));
    STAGE(4, c[i] + A(4, 0) + A(4, 1) + A(4, 2) + A(4, 3), C(4, 0) + C(4, 1) + C(4, 2) + C(4, 3));
    STAGE(5, c[i] + A(5, 0) + A(5, 1) + A(5, 2) + A(5, 3) + A(5, 4),
          C(5, 0) + C(5, 1) + C(5, 2) + C(5, 3) + C(5, 4));
    STAGE(6, u[i] + K(5), C(6, 0) + C(6, 1) + C(6, 2) + C(6, 3) + C(6, 4) + C(6, 5));
    STAGE(7, u[i] + K(6), C(7, 0) + C(7, 1) + C(7, 2) + C(7, 3) + C(7, 4) + C(7, 5) + C(7, 6));
    EACH error[i] = K(7), after[i] = u[i] + error[i];
    slope(after, first);
}
#endif

/* Error of a step that is accepted, change that a first step may make, growth of steps: explicit, stiff. */
typedef struct {
    double relative[2], first_change, growth[2];
} control;

/* Follows one tube; returns the steps tried. */
static int64_t follow(const double *feed, double tau, const control *q, double *out)
{
    double c[S], first[S], after[S], error[S], end[S], largest = 0, change = 0, made = 0, t = 0;
    int64_t steps = 0;
    int rejected = 0;
    EACH c[i] = feed[i], largest = c[i] > largest ? c[i] : largest;
    slope(c, first);
    EACH
    {
        double fast = fabs(first[i]);
        if (c[i] > 0)
            change = fast / c[i] > change ? fast / c[i] : change;
        else
            made = fast > made ? fast : made;
    }
    made /= largest;
    double h = q->first_change / (made > change ? made : change);
    for (; t < tau && steps < 12000; steps++) {
        int last = t + h >= tau, stiff = 0;
        double stride = last ? tau - t : h, size = 1e-10;
        memcpy(end, first, sizeof end);
#ifdef STIFF_FROM
        if (t >= STIFF_FROM) {
            stiff = 1;
            step_stiff(c, stride, end, after, error);
        } else
#endif
            step_explicit(c, stride, end, after, error);
        EACH
        {
            double there = fabs(after[i]) > fabs(c[i]) ? fabs(after[i]) : fabs(c[i]);
            double miss = fabs(error[i]) / (LEAST * largest + q->relative[stiff] * there);
            size = miss <= size ? size : miss;
        }
        double shrink = SAFETY * (stiff ? pow(size, -0.2) : 1 / sqrt(sqrt(sqrt(size))));
        double most = rejected && size <= 1 ? 1.0 : q->growth[stiff];
        shrink = shrink > most ? most : shrink > MOST_SHRINK ? shrink : MOST_SHRINK;
        rejected = !(size <= 1);
        if (!rejected) {
            memcpy(c, after, sizeof c);
            memcpy(first, end, sizeof first);
            t = last ? tau : t + stride;
        }
        h = stride * shrink;
    }
    memcpy(out, c, sizeof c);
    return steps;
}

/* n tubes. Returns the sum of all steps. */
int64_t floor_tubes(int64_t n, const double *feed, const double *tau, const control *q, double *c)
{
    int64_t steps = 0;
    for (int64_t row = 0; row < n; row++)
        steps += follow(feed + row * S, tau[row], q, c + row * S);
    return steps;
}
