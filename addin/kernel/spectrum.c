/* Eigenvalues of a real matrix: is a steady state stable?
 *
 * Balancing, reduction to Hessenberg form by elimination, and the QR algorithm with double shifts:
 * J. H. Wilkinson, C. Reinsch, Handbook for Automatic Computation II, Linear Algebra, 1971, II/11, II/13
 * and II/14. Only called where the cheap proof of stability (is_m_matrix) fails.
 */
#include "kernel.h"

#define MOST_SWEEPS 60 /* per eigenvalue; ten are plenty */
#define AT(i, j) m[(ptrdiff_t)(i) * n + (j)]

static void swap(double *x, double *y)
{
    double t = *x;
    *x = *y;
    *y = t;
}

/* Scales rows and columns by powers of two until their sizes agree. */
static void balance(double *m, int n)
{
    for (int round = 0, done = 0; !done && round < 40; round++) {
        done = 1;
        for (int i = 0; i < n; i++) {
            double row = 0.0, column = 0.0, f = 1.0;
            for (int j = 0; j < n; j++)
                if (j != i)
                    row += fabs(AT(i, j)), column += fabs(AT(j, i));
            if (!(row > 0) || !(column > 0) || !isfinite(row) || !isfinite(column))
                continue;
            double sum = row + column;
            for (; column < row / 2 && f < 1e150; column *= 4)
                f *= 2;
            for (; column >= row * 2 && f > 1e-150; column /= 4)
                f /= 2;
            if ((column + row) / f < 0.95 * sum) {
                done = 0;
                for (int j = 0; j < n; j++)
                    AT(i, j) /= f;
                for (int j = 0; j < n; j++)
                    AT(j, i) *= f;
            }
        }
    }
}

static void to_hessenberg(double *m, int n)
{
    for (int k = 1; k < n - 1; k++) {
        int best = k;
        for (int i = k; i < n; i++)
            if (fabs(AT(i, k - 1)) > fabs(AT(best, k - 1)))
                best = i;
        double pivot = AT(best, k - 1);
        if (best != k) {
            for (int j = k - 1; j < n; j++)
                swap(&AT(best, j), &AT(k, j));
            for (int j = 0; j < n; j++)
                swap(&AT(j, best), &AT(j, k));
        }
        for (int i = k + 1; pivot != 0 && i < n; i++) {
            double share = AT(i, k - 1) / pivot;
            if (share == 0)
                continue;
            for (int j = k - 1; j < n; j++)
                AT(i, j) -= share * AT(k, j);
            for (int j = 0; j < n; j++)
                AT(j, k) += share * AT(j, i);
        }
        for (int i = k + 1; i < n; i++)
            AT(i, k - 1) = 0.0;
    }
}

/* One double-shift sweep on rows and columns low..high. */
static void sweep(double *m, int n, int low, int high, double sum, double product)
{
    /* the first column of (H - s1)(H - s2) */
    double p = AT(low, low) * AT(low, low) + AT(low, low + 1) * AT(low + 1, low) - sum * AT(low, low) + product;
    double q = AT(low + 1, low) * (AT(low, low) + AT(low + 1, low + 1) - sum);
    double r = low + 2 <= high ? AT(low + 1, low) * AT(low + 2, low + 1) : 0.0;
    for (int k = low; k < high; k++) {
        int three = k + 2 <= high;
        if (k > low) {
            p = AT(k, k - 1), q = AT(k + 1, k - 1), r = three ? AT(k + 2, k - 1) : 0.0;
        }
        double size = fabs(p) + fabs(q) + fabs(r);
        if (!(size > 0))
            continue;
        p /= size, q /= size, r /= size;
        double length = sqrt(p * p + q * q + r * r);
        if (p < 0)
            length = -length;
        if (k > low)
            AT(k, k - 1) = -length * size, AT(k + 1, k - 1) = 0.0;
        if (k > low && three)
            AT(k + 2, k - 1) = 0.0;
        /* the reflection I - u u' (2 / u'u), u = (p + length, q, r) */
        double first = p + length, x = first / length, y = q / length, z = r / length, b = q / first, c = r / first;
        for (int j = k; j < n; j++) {
            double t = AT(k, j) + b * AT(k + 1, j) + (three ? c * AT(k + 2, j) : 0.0);
            AT(k, j) -= t * x, AT(k + 1, j) -= t * y;
            if (three)
                AT(k + 2, j) -= t * z;
        }
        int last = k + 3 < high ? k + 3 : high;
        for (int i = 0; i <= last; i++) {
            double t = x * AT(i, k) + y * AT(i, k + 1) + (three ? z * AT(i, k + 2) : 0.0);
            AT(i, k) -= t, AT(i, k + 1) -= t * b;
            if (three)
                AT(i, k + 2) -= t * c;
        }
    }
}

/* The eigenvalue with the largest real part, by its real part and the size of its imaginary part.
 *
 * The matrix (n, n) is used up. Returns 0 where the algorithm did not end or the matrix is not finite.
 */
int rightmost(double *m, int n, double *real, double *imaginary)
{
    double norm = 0.0;
    *real = -INFINITY, *imaginary = 0.0;
    for (int k = 0; k < n * n; k++)
        if (!isfinite(m[k]))
            return 0;
    balance(m, n);
    to_hessenberg(m, n);
    for (int i = 0; i < n; i++)
        for (int j = i ? i - 1 : 0; j < n; j++)
            norm += fabs(AT(i, j));
    for (int high = n - 1, tries = 0; high >= 0;) {
        int low = high;
        for (; low > 0; low--) {
            double near = fabs(AT(low - 1, low - 1)) + fabs(AT(low, low));
            if (fabs(AT(low, low - 1)) <= EPSILON / 2 * (near > 0 ? near : norm))
                break;
        }
        if (low > 0)
            AT(low, low - 1) = 0.0;
        if (low >= high - 1) {
            double x = AT(high, high), re = x, im = 0.0;
            if (low == high - 1) {
                double y = AT(low, low), w = AT(high, low) * AT(low, high), half = 0.5 * (y - x);
                double under = half * half + w, span = sqrt(fabs(under));
                re = under >= 0 ? x + half + span : x + half;
                im = under >= 0 ? 0.0 : span;
            }
            if (re > *real)
                *real = re, *imaginary = im;
            high = low - 1, tries = 0;
            continue;
        }
        if (++tries > MOST_SWEEPS)
            return 0;
        double x = AT(high, high), y = AT(high - 1, high - 1), w = AT(high, high - 1) * AT(high - 1, high);
        double sum = x + y, product = x * y - w;
        if (tries % 10 == 0) { /* an exceptional shift breaks a cycle */
            double off = fabs(AT(high, high - 1)) + fabs(AT(high - 1, high - 2));
            sum = 1.5 * off + 2 * x, product = off * off + 1.5 * off * x + x * x;
        }
        sweep(m, n, low, high, sum, product);
    }
    return 1;
}
