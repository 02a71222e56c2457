/* The start-up of a tank by implicit Euler steps: slow and rough, but hard to stop.
 *
 * Each step is itself a steady tank, of residence time 1/(1/h + 1/tau), fed with what is there and with the
 * feed in proportion. Newton's method solves it to the end, so that corners of the laws where a species runs
 * out do no harm. It takes over where the Rosenbrock method gets stuck at one.
 */
#include <string.h>

#include "kernel.h"

#define MOST_STEPS 1500
#define MOST_ITERATIONS 20000 /* of Newton's method, in all steps and looks; ten times what any tank that rests took */
#define ERROR 0.02   /* of a concentration, per step */
#define TRACE 1e-12  /* of the largest concentration: below it a species may change as it likes */
#define FIRST 1e-9   /* residence times: first step, and when to stop */
#define LAST 100.0
#define MOST_GROWTH 3.0
#define MOST_SHRINK 0.2
#define LOOK_EVERY 10 /* steps between two looks for the state ahead */
#define BEGIN 1e-6    /* depths of the cut: where Newton's method begins */
#define NEARBY 1e-2   /* relative distance at which it is reached, but for traces */
#define NEARBY_TRACE 1e-9

/* Where Newton's method begins: at c, but for species far below the depth at which their laws are cut, from
 * where it would take too many steps up to where supply holds them. */
static void begin_at(const desk *d, const tank *t, const double *c, double *out)
{
    memcpy(out, c, (size_t)d->net->species * sizeof *c);
    for (int k = 0; k < t->laws.rule->n; k++) {
        double *x = out + t->laws.rule->species[k], least = BEGIN * t->laws.depth[k];
        *x = *x > least ? *x : least;
    }
}

/* `after`: c after an implicit step of size h; returns whether there is such a step. */
static int euler(desk *d, const tank *t, const double *c, double h, double *mixed, double *after, int *iterations)
{
    int S = d->net->species;
    double rate = 1.0 / h + 1.0 / t->tau;
    for (int i = 0; i < S; i++)
        mixed[i] = (c[i] / h + t->feed[i] / t->tau) / rate;
    tank step = {t->laws, mixed, 1.0 / rate, t->nothing};
    begin_at(d, &step, c, after);
    return newton(d, &step, after, 60, iterations);
}

static int is_near(const double *ahead, const double *now, int S, double largest)
{
    for (int i = 0; i < S; i++)
        if (!(fabs(ahead[i] - now[i]) <= NEARBY * ahead[i] + NEARBY_TRACE * largest))
            return 0;
    return 1;
}

/* Moves c to the state at which the tank arrives from it; returns whether there is one. */
int creep(desk *d, const tank *t, double *c, int *iterations)
{
    int S = d->net->species, found = 0;
    double *keep = d->next, *trend = take(d, S), *after = take(d, S), *mixed = take(d, S);
    double time = 0.0, h = FIRST * t->tau, largest = 0.0;
    for (int i = 0; i < S; i++) {
        trend[i] = 0.0;
        largest = fmax(largest, fmax(c[i], t->feed[i]));
    }
    int before = *iterations;
    for (int step = 1; step <= MOST_STEPS && !found && *iterations - before < MOST_ITERATIONS; step++) {
        double size = 1e-6;
        if (!euler(d, t, c, h, mixed, after, iterations))
            size = INFINITY;
        for (int i = 0; i < S && size < INFINITY; i++) {
            double error = fabs(after[i] - c[i] - h * trend[i]) / (ERROR * fmax(after[i], c[i]) + TRACE * largest);
            size = !isfinite(error) ? INFINITY : error > size ? error : size;
        }
        if (size <= 1.0 || (h < 1e-30 * t->tau && size < INFINITY)) {
            time += h;
            for (int i = 0; i < S; i++) {
                trend[i] = (after[i] - c[i]) / h;
                c[i] = after[i];
            }
        }
        if (step % LOOK_EVERY == 0 || time > LAST * t->tau) {
            begin_at(d, t, c, after);
            if (newton(d, t, after, 60, iterations) && is_near(after, c, S, largest)) {
                memcpy(c, after, (size_t)S * sizeof *c);
                found = 1;
            }
        }
        double factor = 0.9 / sqrt(size);
        h *= factor > MOST_GROWTH ? MOST_GROWTH : factor < MOST_SHRINK ? MOST_SHRINK : factor;
    }
    d->next = keep;
    return found;
}
