/* The register machine: rates, their derivatives by reverse mode, and tangents of first and second order.
 *
 * A switch over thirteen operations costs a nanosecond or two per instruction; closures, threaded code or
 * a compiler per network were weighed and left: they would win a factor below two on small networks and
 * lose portability. Nothing traps: where a law is undefined the result is nan or inf, and callers look.
 */
#include <string.h>

#include "kernel.h"

#define LN10 2.302585092994045684

/* Temperature, parameters and literals into their registers, and all that follows from them alone. */
void bind_case(const program *q, double *g, double T, const double *p)
{
    int at = q->leaves;
    for (int i = 0; i < at; i++)
        g[i] = 0.0;
    g[at++] = T;
    if (q->parameters)
        memcpy(g + at, p, (size_t)q->parameters * sizeof *g);
    if (q->literals)
        memcpy(g + at + q->parameters, q->literal, (size_t)q->literals * sizeof *g);
    run(q, 0, q->prelude, g, 0);
}

/* rint without its library call; what is too large for an int has no fraction. */
static int is_whole(double y) { return !(y > -1e9 && y < 1e9) || y == (double)(int)y; }

/* x^y with the odd continuation -(-x)^y of fractional powers below zero; `strict`: nan there. */
static double power(double x, double y, int strict)
{
    if (y == 1)
        return x;
    if (y == 2)
        return x * x;
    if (x >= 0 || is_whole(y))
        return y == 0.5 ? sqrt(x) : pow(x, y);
    return strict ? NAN : -pow(-x, y);
}

static double root(double x, int strict)
{
    if (x >= 0)
        return sqrt(x);
    return strict ? NAN : -sqrt(-x);
}

static double smaller(double x, double y) { return y < x || y != y ? y : x; }
static double larger(double x, double y) { return y > x || y != y ? y : x; }

/* Instructions from..to-1, in place. */
void run(const program *q, int from, int to, double *g, int strict)
{
    for (const instruction *s = q->code + from, *end = q->code + to; s < end; s++) {
        double x = g[s->a], y = g[s->b], z;
        switch (s->op) {
        case ADD: z = x + y; break;
        case SUB: z = x - y; break;
        case MUL: z = x * y; break;
        case DIV: z = x / y; break;
        case POW: z = power(x, y, strict); break;
        case MIN: z = smaller(x, y); break;
        case MAX: z = larger(x, y); break;
        case NEG: z = -x; break;
        case SQRT: z = root(x, strict); break;
        case EXP: z = exp(x); break;
        case LN: z = log(x); break;
        case LOG10: z = log10(x); break;
        default: z = fabs(x); break;
        }
        g[s->target] = z;
    }
}

/* d(x^y)/dx; the odd continuation of a fractional power has an even slope. */
static double power_slope(double x, double y, double z)
{
    if (y == 0)
        return 0.0;
    if (y == 1)
        return 1.0;
    if (x > 0) {
        double q = y * (z / x);
        return z > 1e-290 && q < 1e290 && q > -1e290 ? q : y * pow(x, y - 1.0);
    }
    return y * pow(is_whole(y) ? x : -x, y - 1.0);
}

static double exponent_slope(double x, double y, double z) { return x == 0 && y > 0 ? 0.0 : z * log(x); }

/* dz/dx, or dz/dy if `second`. */
static double partial(int op, int second, double x, double y, double z)
{
    switch (op) {
    case ADD: return 1.0;
    case SUB: return second ? -1.0 : 1.0;
    case MUL: return second ? x : y;
    case DIV: return second ? -z / y : 1.0 / y;
    case POW: return second ? exponent_slope(x, y, z) : power_slope(x, y, z);
    case MIN: return second ? (double)(y < x) : (double)(x <= y);
    case MAX: return second ? (double)(y > x) : (double)(x >= y);
    case NEG: return -1.0;
    case SQRT: return 0.5 / fabs(z);
    case EXP: return z;
    case LN: return 1.0 / x;
    case LOG10: return 1.0 / (LN10 * x);
    default: return (double)(x > 0) - (double)(x < 0);
    }
}

/* Derivatives of one term by all that its path leads to, into `adjoint` at those registers. */
void reverse(const program *q, int term, const double *g, double *adjoint)
{
    adjoint[q->output[term]] = 1.0;
    const edge *end = q->path + q->path_start[term + 1];
    for (const edge *e = q->path + q->path_start[term]; e < end; e++) {
        double owed = adjoint[e->target];
        switch (e->op) {
        case ADD: break;
        case SUB: owed = e->second ? -owed : owed; break;
        case MUL: owed *= g[e->second ? e->x : e->y]; break;
        default: owed *= partial(e->op, e->second, g[e->x], g[e->y], g[e->target]);
        }
        adjoint[e->source] = e->first ? owed : adjoint[e->source] + owed;
    }
}

/* Second derivatives by x twice, x and y, y twice. */
static void curvature(int op, double x, double y, double z, double *xx, double *xy, double *yy)
{
    *xx = *xy = *yy = 0.0;
    switch (op) {
    case MUL: *xy = 1.0; break;
    case DIV: *xy = -1.0 / (y * y), *yy = 2.0 * z / (y * y); break;
    case POW:
        if (y != 0 && y != 1)
            *xx = y * (y - 1.0) * power(fabs(x), y - 2.0, 0) * (x < 0 && !is_whole(y) ? -1.0 : 1.0);
        if (x > 0)
            *xy = pow(x, y - 1.0) * (1.0 + y * log(x)), *yy = z * log(x) * log(x);
        break;
    case SQRT: *xx = -0.25 / (x * fabs(z)); break;
    case EXP: *xx = z; break;
    case LN: *xx = -1.0 / (x * x); break;
    case LOG10: *xx = -1.0 / (LN10 * x * x); break;
    default: break;
    }
}

/* Directional derivatives a, b of registers g, and the mixed second one ab, through instructions from..to-1.
 *
 * b and ab may be NULL: first order only. A direction that is zero is not multiplied: 0 times the infinite
 * slope of a root at zero is nothing.
 */
void tangent(const program *q, int from, int to, const double *g, double *a, double *b, double *ab)
{
    for (const instruction *s = q->code + from, *end = q->code + to; s < end; s++) {
        int i = s->a, j = s->b, k = s->target, both = s->op <= MAX;
        double x = g[i], y = g[j], z = g[k], da = 0.0, db = 0.0, dab = 0.0;
        double ya = both ? a[j] : 0.0, yb = both && b ? b[j] : 0.0, yab = both && b ? ab[j] : 0.0;
        double fx = 0.0, fy = 0.0;
        if (a[i] != 0.0 || (b && (b[i] != 0.0 || ab[i] != 0.0)))
            fx = partial(s->op, 0, x, y, z);
        if (ya != 0.0 || yb != 0.0 || yab != 0.0)
            fy = partial(s->op, 1, x, y, z);
        da = (a[i] != 0.0 ? fx * a[i] : 0.0) + (ya != 0.0 ? fy * ya : 0.0);
        if (b) {
            db = (b[i] != 0.0 ? fx * b[i] : 0.0) + (yb != 0.0 ? fy * yb : 0.0);
            dab = (ab[i] != 0.0 ? fx * ab[i] : 0.0) + (yab != 0.0 ? fy * yab : 0.0);
            double pxx = a[i] * b[i], pxy = a[i] * yb + ya * b[i], pyy = ya * yb;
            if (pxx != 0.0 || pxy != 0.0 || pyy != 0.0) {
                double xx, xy, yy;
                curvature(s->op, x, y, z, &xx, &xy, &yy);
                dab += (pxx != 0.0 ? xx * pxx : 0.0) + (pxy != 0.0 ? xy * pxy : 0.0) + (pyy != 0.0 ? yy * pyy : 0.0);
            }
            b[k] = db, ab[k] = dab;
        }
        a[k] = da;
    }
}
