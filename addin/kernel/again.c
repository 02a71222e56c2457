/* One vessel solved again and again, and the watch over what would make its network another. */
#include <stdlib.h>
#include <string.h>

#include "kernel.h"

struct mt_again {
    vessel v;
    void *self;
    int species, parameters;
    double T, *p;
    uint8_t *fed;
};

void mt_again_free(mt_again *a)
{
    if (!a)
        return;
    if (a->self)
        a->v.close(a->self);
    free(a->p);
    free(a->fed);
    free(a);
}

/* Takes over `self`; NULL, and `self` closed, where memory is short. */
mt_again *keep_vessel(const network *w, void *self, vessel v)
{
    mt_again *a = calloc(1, sizeof *a);
    if (!a) {
        v.close(self);
        return NULL;
    }
    a->v = v, a->self = self, a->species = w->all, a->parameters = w->laws.parameters;
    a->p = malloc(((size_t)a->parameters + 1) * sizeof *a->p);
    a->fed = malloc((size_t)a->species + 1);
    if (!a->p || !a->fed) {
        mt_again_free(a);
        return NULL;
    }
    a->T = *v.T;
    if (a->parameters)
        memcpy(a->p, v.p, (size_t)a->parameters * sizeof *a->p);
    for (int i = 0; i < a->species; i++)
        a->fed[i] = v.feed[i] > 0;
    return a;
}

static int has_changed(const mt_again *a)
{
    if (memcmp(&a->T, a->v.T, sizeof a->T))
        return 1;
    if (a->parameters && memcmp(a->p, a->v.p, (size_t)a->parameters * sizeof *a->p))
        return 1;
    for (int i = 0; i < a->species; i++)
        if (a->fed[i] != (a->v.feed[i] > 0))
            return 1;
    return 0;
}

int mt_again_solve(mt_again *a)
{
    if (!a)
        return MT_BAD_REQUEST;
    return has_changed(a) ? MT_CHANGED : a->v.solve(a->self);
}
