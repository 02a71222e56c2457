/* Linear systems with the matrix of a balance, I - tau J or I/(gamma h) - J.
 *
 * Its pattern is that of the network, the same in every iteration, step and case. The order of elimination
 * is found once (least fill first: H. M. Markowitz, Management Sci. 3 (1957) 255) and kept as a list of
 * places in the dense matrix, so that a network of twenty species costs its few hundred products, not the
 * thousands of dense elimination. Pivots stay on the diagonal, which is right for the diagonally dominant
 * matrices that balances mostly have, and wrong for some. So the first solution is judged by its backward
 * error, component by component (W. Oettli, W. Prager, Numer. Math. 6 (1964) 405); where it fails, dense
 * elimination with scaled partial pivoting takes its place. Pivoting always was weighed: it can't keep the
 * pattern, and on twenty species it was most of the work.
 */
#include <stdlib.h>
#include <string.h>

#include "kernel.h"

#define BACKWARD 1e-11     /* largest backward error that is taken */
#define MOST_ORDERED 300   /* species: to look for the best order costs their number cubed */
#define LONGEST 50000000   /* of a plan: 200 MB; a full matrix of 400 species has as much */

static void mark_pattern(const network *w, uint8_t *mark)
{
    int S = w->species;
    for (int i = 0; i < S; i++)
        mark[(size_t)i * S + i] = 1;
    for (int j = 0; j < w->reactions; j++)
        for (int k = w->gain_start[j]; k < w->gain_start[j + 1]; k++)
            for (int m = w->net_start[j]; m < w->net_start[j + 1]; m++)
                mark[(size_t)w->gain_species[k] * S + w->net_leaf[m]] = 1;
}

/* The remaining row and column with the least possible fill. */
static int cheapest(const uint8_t *mark, const uint8_t *done, int S)
{
    int best = -1;
    int64_t least = INT64_MAX;
    for (int k = 0; k < S; k++) {
        int64_t rows = 0, columns = 0;
        if (done[k])
            continue;
        for (int i = 0; i < S; i++)
            if (!done[i] && i != k)
                rows += mark[(size_t)i * S + k], columns += mark[(size_t)k * S + i];
        if (rows * columns < least)
            least = rows * columns, best = k;
    }
    return best;
}

/* Orders pivots and marks fill. */
static void order_pivots(uint8_t *mark, uint8_t *done, int32_t *order, int S)
{
    for (int step = 0; step < S; step++) {
        int k = S <= MOST_ORDERED ? cheapest(mark, done, S) : step;
        order[step] = k;
        done[k] = 1;
        for (int i = 0; i < S; i++)
            if (!done[i] && mark[(size_t)i * S + k])
                for (int j = 0; j < S; j++)
                    if (!done[j] && mark[(size_t)k * S + j])
                        mark[(size_t)i * S + j] = 1;
    }
}

static void put(int32_t *out, int64_t *at, int64_t value)
{
    if (out)
        out[*at] = (int32_t)value;
    ++*at;
}

/* Writes the row operations; with `out` NULL only counts their length. */
static int64_t write_program(const uint8_t *mark, const int32_t *order, const int32_t *rank, int S, int32_t *out)
{
    int64_t at = 0;
    for (int step = 0; step < S; step++) {
        int k = order[step];
        int64_t rows = 0, columns = 0;
        for (int i = 0; i < S; i++) {
            rows += rank[i] > step && mark[(size_t)i * S + k];
            columns += rank[i] > step && mark[(size_t)k * S + i];
        }
        put(out, &at, k), put(out, &at, rows), put(out, &at, columns);
        for (int i = 0; i < S; i++) {
            if (rank[i] <= step || !mark[(size_t)i * S + k])
                continue;
            put(out, &at, (int64_t)i * S + k);
            for (int j = 0; j < S; j++)
                if (rank[j] > step && mark[(size_t)k * S + j])
                    put(out, &at, (int64_t)i * S + j), put(out, &at, (int64_t)k * S + j);
        }
    }
    return at;
}

static int count(const uint8_t *mark, int64_t n)
{
    int out = 0;
    for (int64_t k = 0; k < n; k++)
        out += mark[k];
    return out;
}

static void list_pattern(const uint8_t *mark, int S, int32_t *start, int32_t *column)
{
    int at = 0;
    for (int i = 0; i < S; i++) {
        start[i] = at;
        for (int j = 0; j < S; j++)
            if (mark[(size_t)i * S + j])
                column[at++] = j;
    }
    start[S] = at;
}

/* Both factors column by column: what one column takes from many unknowns is independent work, what a row
 * gathers from many is a chain of additions. */
static void list_factors(elimination *p, const uint8_t *mark, const int32_t *rank)
{
    int S = p->n, low = 0, up = 0;
    for (int step = 0; step < S; step++) {
        int k = p->order[step];
        for (int i = 0; i < S; i++)
            if (rank[i] > step && mark[(size_t)i * S + k])
                p->lower_at[low] = i * S + k, p->lower_column[low] = k, p->lower[low++] = i;
    }
    for (int step = S - 1; step >= 0; step--) {
        int k = p->order[step];
        for (int i = 0; i < S; i++)
            if (rank[i] < step && mark[(size_t)i * S + k])
                p->upper_at[up] = i * S + k, p->upper_column[up] = k, p->upper[up++] = i;
    }
    p->n_lower = low, p->n_upper = up;
}

int plan_elimination(elimination *p, const network *w)
{
    int S = p->n = w->species, ok = 0;
    size_t places = (size_t)S * S;
    uint8_t *mark = calloc(places + S + 1, 1);
    int32_t *rank = malloc((2 * (size_t)S + 1) * sizeof *rank);
    if (mark && rank) {
        int32_t *order = rank + S;
        mark_pattern(w, mark);
        int filled = count(mark, (int64_t)places);
        uint8_t *pattern = malloc(places + 1);
        if (pattern) {
            memcpy(pattern, mark, places);
            order_pivots(mark, mark + places, order, S);
            for (int step = 0; step < S; step++)
                rank[order[step]] = step;
            int64_t length = write_program(mark, order, rank, S, NULL);
            int with_fill = count(mark, (int64_t)places);
            p->memory = length > LONGEST ? NULL
                                           : malloc(((size_t)length + 2 * (size_t)S + 1 + 6 * (size_t)with_fill +
                                                     (size_t)filled) * sizeof *p->memory);
            if (p->memory) {
                p->length = (int)length;
                p->program = p->memory;
                p->order = p->program + length;
                p->row_start = p->order + S;
                p->lower = p->row_start + S + 1;
                p->upper = p->lower + with_fill;
                p->lower_at = p->upper + with_fill;
                p->upper_at = p->lower_at + with_fill;
                p->lower_column = p->upper_at + with_fill;
                p->upper_column = p->lower_column + with_fill;
                p->column = p->upper_column + with_fill;
                memcpy(p->order, order, (size_t)S * sizeof *order);
                write_program(mark, order, rank, S, p->program);
                list_factors(p, mark, rank);
                list_pattern(pattern, S, p->row_start, p->column);
                ok = 1;
            }
            free(pattern);
        }
    }
    free(mark);
    free(rank);
    return ok;
}

void forget_elimination(elimination *p)
{
    free(p->memory);
    p->memory = NULL;
}

/* Factors in place along the plan; the reciprocal pivots go to `diagonal`. */
static void eliminate(const elimination *p, double *m, double *diagonal)
{
    int S = p->n;
    const int32_t *at = p->program;
    for (int step = 0; step < S; step++) {
        int k = at[0], rows = at[1], columns = at[2];
        double per = 1.0 / m[(ptrdiff_t)k * S + k];
        diagonal[k] = per;
        at += 3;
        for (int i = 0; i < rows; i++) {
            double share = m[*at] * per;
            m[*at++] = share;
            for (int j = 0; j < columns; j++, at += 2)
                m[at[0]] -= share * m[at[1]];
        }
    }
}

/* Lines the factors up in the order in which substitution reads them, rows of the upper one over their pivots. */
static void pack(desk *d)
{
    const elimination *p = &d->net->plan;
    for (int e = 0; e < p->n_lower; e++)
        d->lower[e] = d->factors[p->lower_at[e]];
    for (int e = 0; e < p->n_upper; e++)
        d->upper[e] = d->factors[p->upper_at[e]] * d->diagonal[p->upper[e]];
}

/* One flat loop each way: nested loops of two or three rounds are mostly mispredicted branches. */
static void solve_sparse(const desk *d, double *restrict b)
{
    const elimination *p = &d->net->plan;
    const double *restrict lower = d->lower, *restrict upper = d->upper, *restrict diagonal = d->diagonal;
    for (int e = 0; e < p->n_lower; e++)
        b[p->lower[e]] -= lower[e] * b[p->lower_column[e]];
    for (int i = 0; i < p->n; i++)
        b[i] *= diagonal[i];
    for (int e = 0; e < p->n_upper; e++)
        b[p->upper[e]] -= upper[e] * b[p->upper_column[e]];
}

/* Rows and columns scaled (unknowns relative to `size`, rows to their largest entry), rows exchanged. */
static void factor_dense(desk *d, const double *matrix, const double *size)
{
    int S = d->net->species;
    double *m = d->factors;
    for (int i = 0; i < S; i++) {
        double largest = 0.0;
        for (int j = 0; j < S; j++) {
            double x = matrix[(ptrdiff_t)i * S + j] * size[j];
            m[(ptrdiff_t)i * S + j] = x;
            largest = fabs(x) > largest ? fabs(x) : largest;
        }
        d->row_scale[i] = 1.0 / largest;
        d->column_scale[i] = size[i];
        for (int j = 0; j < S; j++)
            m[(ptrdiff_t)i * S + j] *= d->row_scale[i];
    }
    for (int k = 0; k < S; k++) {
        int best = k;
        for (int i = k + 1; i < S; i++)
            if (fabs(m[(ptrdiff_t)i * S + k]) > fabs(m[(ptrdiff_t)best * S + k]))
                best = i;
        d->pivots[k] = best;
        for (int j = 0; best != k && j < S; j++) {
            double x = m[(ptrdiff_t)k * S + j];
            m[(ptrdiff_t)k * S + j] = m[(ptrdiff_t)best * S + j];
            m[(ptrdiff_t)best * S + j] = x;
        }
        d->diagonal[k] = 1.0 / m[(ptrdiff_t)k * S + k];
        for (int i = k + 1; i < S; i++) {
            double share = m[(ptrdiff_t)i * S + k] * d->diagonal[k];
            m[(ptrdiff_t)i * S + k] = share;
            if (share != 0)
                for (int j = k + 1; j < S; j++)
                    m[(ptrdiff_t)i * S + j] -= share * m[(ptrdiff_t)k * S + j];
        }
    }
}

static void solve_dense(const desk *d, double *b)
{
    int S = d->net->species;
    const double *m = d->factors;
    for (int i = 0; i < S; i++)
        b[i] *= d->row_scale[i];
    for (int k = 0; k < S; k++) {
        double x = b[d->pivots[k]];
        b[d->pivots[k]] = b[k];
        b[k] = x;
        for (int i = k + 1; i < S; i++)
            b[i] -= m[(ptrdiff_t)i * S + k] * x;
    }
    for (int i = S - 1; i >= 0; i--) {
        double x = b[i];
        for (int j = i + 1; j < S; j++)
            x -= m[(ptrdiff_t)i * S + j] * b[j];
        b[i] = x * d->diagonal[i];
    }
    for (int i = 0; i < S; i++)
        b[i] *= d->column_scale[i];
}

/* Is x, but for rounding, the solution of a system that close to this one? */
static int is_solution(const desk *d, const double *matrix, const double *x, const double *b)
{
    const elimination *p = &d->net->plan;
    int S = p->n;
    for (int i = 0; i < S; i++) {
        double off = -b[i], sum = fabs(b[i]);
        const double *row = matrix + (ptrdiff_t)i * S;
        for (int e = p->row_start[i]; e < p->row_start[i + 1]; e++) {
            double part = row[p->column[e]] * x[p->column[e]];
            off += part;
            sum += fabs(part);
        }
        if (!(fabs(off) <= BACKWARD * sum))
            return 0;
    }
    return 1;
}

/* b becomes the solution x of matrix x = b; further right sides by `solve`.
 *
 * size: what unknowns are measured by where rows are exchanged. The matrix is left as it is.
 */
void factor_and_solve(desk *d, const double *matrix, const double *size, double *b)
{
    size_t S = (size_t)d->net->species;
    memcpy(d->factors, matrix, S * S * sizeof *matrix);
    eliminate(&d->net->plan, d->factors, d->diagonal);
    memcpy(d->probe, b, S * sizeof *b);
    d->dense = 0;
    pack(d);
    solve_sparse(d, b);
    if (is_solution(d, matrix, b, d->probe))
        return;
    d->dense = 1;
    factor_dense(d, matrix, size);
    memcpy(b, d->probe, S * sizeof *b);
    solve_dense(d, b);
}

void solve(const desk *d, double *b)
{
    if (d->dense)
        solve_dense(d, b);
    else
        solve_sparse(d, b);
}

/* True if the matrix with its diagonal kept and the sizes of all else taken off is an M-matrix.
 *
 * Then every eigenvalue of the matrix itself has a positive real part (A. Berman, R. J. Plemmons,
 * Nonnegative Matrices in the Mathematical Sciences, 1994, chapter 6): a proof of stability at the price of
 * one elimination, where eigenvalues cost twenty times as much. Afterwards `solve` solves with that matrix: no
 * entry of its inverse is smaller than the size of the same entry of the true one (A. M. Ostrowski, Comment.
 * Math. Helv. 10 (1937) 69).
 */
int is_m_matrix(desk *d, const double *matrix)
{
    const elimination *p = &d->net->plan;
    int S = p->n;
    double *m = d->factors;
    for (int k = 0; k < S * S; k++)
        m[k] = -fabs(matrix[k]);
    for (int i = 0; i < S; i++)
        m[(ptrdiff_t)i * S + i] = matrix[(ptrdiff_t)i * S + i];
    eliminate(p, m, d->diagonal);
    for (int i = 0; i < S; i++) {
        double least = 1e-13 * matrix[(ptrdiff_t)i * S + i];
        if (!(d->diagonal[i] > 0 && d->diagonal[i] * least < 1.0 && matrix[(ptrdiff_t)i * S + i] > 0))
            return 0;
    }
    pack(d);
    d->dense = 0;
    return 1;
}
