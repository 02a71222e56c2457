/* Rates and derivatives at given states, and single steps: the kernel's parts, for callers and tests. */
#include <string.h>

#include "kernel.h"

/* Derivatives of all terms by T and parameters, from executed registers. */
static void by_constants(const program *q, const double *g, double *a, const mt_rates *all, int64_t row)
{
    for (int k = 0; k <= q->parameters; k++) {
        memset(a, 0, (size_t)q->registers * sizeof *a);
        a[q->leaves + k] = 1.0;
        tangent(q, 0, q->prelude + q->body, g, a, NULL, NULL);
        for (int t = 0; t < q->terms; t++) {
            double x = a[q->output[t]];
            if (k)
                all->by_p[(row * q->terms + t) * q->parameters + k - 1] = x;
            else
                all->by_T[row * q->terms + t] = x;
        }
    }
}

static int is_complete(const network *w, const mt_rates *a)
{
    int some = a->by_c || a->by_T || a->by_p, every = a->by_c && a->by_T && (a->by_p || !w->laws.parameters);
    return a->c && a->T && (a->p || !w->laws.parameters) && a->rate && some == every;
}

int mt_evaluate(const mt_network *w, const mt_rates *all)
{
    desk d;
    if (!w || !all || all->n < 0 || !is_complete(w, all))
        return MT_BAD_REQUEST;
    const program *q = &w->laws;
    if (!desk_open(&d, w, q->registers))
        return MT_NO_MEMORY;
    double *a = take(&d, q->registers);
    for (int64_t row = 0; row < all->n; row++) {
        bind_case(q, d.registers, all->T[row], q->parameters ? all->p + row * q->parameters : NULL);
        for (int i = 0; i < q->leaves; i++)
            d.registers[i] = all->c[row * w->all + w->present[i]];
        run(q, q->prelude, q->prelude + q->body, d.registers, all->strict != 0);
        for (int t = 0; t < q->terms; t++)
            all->rate[row * q->terms + t] = d.registers[q->output[t]];
        if (!all->by_c)
            continue;
        double *by_c = all->by_c + row * q->terms * w->all;
        memset(by_c, 0, (size_t)q->terms * (size_t)w->all * sizeof *by_c);
        for (int t = 0; t < q->terms; t++) {
            reverse(q, t, d.registers, d.adjoints);
            for (int m = q->entry_start[t]; m < q->entry_start[t + 1]; m++)
                if (q->entry_read[m])
                    by_c[(ptrdiff_t)t * w->all + w->present[q->entry_leaf[m]]] = d.adjoints[q->entry_leaf[m]];
        }
        by_constants(q, d.registers, a, all, row);
    }
    desk_close(&d);
    return MT_DONE;
}

int mt_step(const mt_network *w, int method_number, const double *feed, double T, const double *p, const double *c,
            double h, double *after, double *error)
{
    desk d;
    if (!w || !feed || (!p && w->laws.parameters) || !c || !after || !error || method_number < 0 || method_number > 1)
        return MT_BAD_REQUEST;
    if (!desk_open(&d, w, 0))
        return MT_NO_MEMORY;
    double *least = take(&d, w->species), largest = 0.0;
    for (int i = 0; i < w->species; i++)
        largest = fmax(largest, feed[i]);
    largest = largest > 0 ? largest : NOWHERE;
    for (int i = 0; i < w->species; i++)
        least[i] = 1e-25 * largest;
    for (int k = 0; k < w->moving.n; k++)
        d.depth_moving[k] = w->moving.share[k] * largest;
    bind_case(&w->laws, d.registers, T, p);
    flow f = {{&w->moving, d.depth_moving}, feed, 0.0};
    METHODS[method_number].step(&d, &f, c, h, least, after, error, NULL);
    desk_close(&d);
    return MT_DONE;
}
