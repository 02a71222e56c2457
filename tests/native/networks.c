/* Sound networks from the corpus, and damaged ones made of them. */
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "fuzz.h"

packed *corpus;
int64_t n_corpus;

void read_corpus(const char *name)
{
    FILE *in = fopen(name, "rb");
    check(in && fread(&n_corpus, sizeof n_corpus, 1, in) == 1, "no corpus");
    corpus = calloc((size_t)n_corpus, sizeof *corpus);
    check(corpus != NULL, "out of memory");
    for (packed *p = corpus; p < corpus + n_corpus; p++) {
        check(fread(&p->n_ints, sizeof p->n_ints, 1, in) == 1 && fread(&p->n_reals, sizeof p->n_reals, 1, in) == 1,
              "a short corpus");
        size_t ints = (size_t)p->n_ints, reals = (size_t)p->n_reals;
        p->ints = malloc(ints * sizeof *p->ints), p->reals = malloc(reals * sizeof *p->reals);
        check(p->ints && p->reals && fread(p->ints, sizeof *p->ints, ints, in) == ints &&
                  fread(p->reals, sizeof *p->reals, reals, in) == reals,
              "a short corpus");
    }
    fclose(in);
}

void free_packed(packed *p)
{
    free(p->ints);
    free(p->reals);
}

/* The head of a and the tail of b, both cut anywhere; a == b cuts or repeats a piece. */
packed splice(const packed *a, int64_t ints, int64_t reals, const packed *b, int64_t from_int, int64_t from_real)
{
    packed out = {NULL, NULL, ints + b->n_ints - from_int, reals + b->n_reals - from_real};
    out.ints = malloc((size_t)out.n_ints * sizeof *out.ints);
    out.reals = malloc((size_t)out.n_reals * sizeof *out.reals);
    check(out.ints && out.reals, "out of memory");
    memcpy(out.ints, a->ints, (size_t)ints * sizeof *out.ints);
    memcpy(out.ints + ints, b->ints + from_int, (size_t)(b->n_ints - from_int) * sizeof *out.ints);
    memcpy(out.reals, a->reals, (size_t)reals * sizeof *out.reals);
    memcpy(out.reals + reals, b->reals + from_real, (size_t)(b->n_reals - from_real) * sizeof *out.reals);
    return out;
}

packed copy_of(const packed *p) { return splice(p, p->n_ints, p->n_reals, p, p->n_ints, p->n_reals); }

static void damage_int(packed *p)
{
    static const int32_t SPECIAL[] = {0, 1, -1, 2, 12, 13, 255, 1000, 1001, 50000, 100000, 100001, INT32_MAX, INT32_MIN};
    if (!p->n_ints)
        return;
    /* every other time in the header, on which all else depends */
    int32_t *x = p->ints + (below(4) ? below(p->n_ints) : below(p->n_ints < 14 ? p->n_ints : 14));
    switch (below(6)) {
    case 0: *x = (int32_t)((uint32_t)*x ^ (uint32_t)1 << below(32)); break;
    case 1: *x = SPECIAL[below((int64_t)(sizeof SPECIAL / sizeof *SPECIAL))]; break;
    case 2: *x = p->ints[below(p->n_ints)]; break;
    case 3: *x = (int32_t)below(40); break;
    default: *x = (int32_t)((uint32_t)*x + (below(2) ? 1u : UINT32_MAX));
    }
}

static void damage_real(packed *p)
{
    if (!p->n_reals)
        return;
    double *x = p->reals + below(p->n_reals);
    uint64_t bits;
    switch (below(3)) {
    case 0:
        memcpy(&bits, x, sizeof bits);
        bits ^= (uint64_t)1 << below(64);
        memcpy(x, &bits, sizeof bits);
        break;
    case 1: *x = nasty(); break;
    default: *x = p->reals[below(p->n_reals)];
    }
}

static void damage_length(packed *p)
{
    const packed *other = below(2) ? p : corpus + below(n_corpus);
    int64_t ints = below(p->n_ints + 1), reals = below(p->n_reals + 1);
    int64_t from_int = below(other->n_ints + 1), from_real = below(other->n_reals + 1);
    switch (below(4)) {
    case 0: from_int = other->n_ints, from_real = other->n_reals; break;       /* cut short */
    case 1: ints = p->n_ints, reals = p->n_reals; break;                       /* made longer */
    case 2: ints = p->n_ints, from_int = other->n_ints, reals = p->n_reals; break; /* reals only */
    default: break;
    }
    packed out = splice(p, ints, reals, other, from_int, from_real);
    free_packed(p);
    *p = out;
}

/* Two instructions, edges or the like change places: both stay in bounds, their order may not. */
static void swap_ints(packed *p)
{
    if (!p->n_ints)
        return;
    int64_t i = below(p->n_ints), j = below(2) ? below(p->n_ints) : i + below(p->n_ints - i);
    int32_t x = p->ints[i];
    p->ints[i] = p->ints[j], p->ints[j] = x;
}

sizes sizes_of(const packed *p) { return (sizes){p->ints[2], p->ints[4], p->ints[6]}; }

mt_network *damaged_network(packed *out)
{
    for (int tries = 0; tries < 40; tries++) {
        *out = copy_of(corpus + below(n_corpus));
        for (int64_t k = 1 + below(1 + below(6)); k > 0; k--)
            switch (below(8)) {
            case 0: damage_length(out); break;
            case 1: case 2: damage_real(out); break;
            case 3: swap_ints(out); break;
            default: damage_int(out);
            }
        mt_network *w = mt_network_new(out->ints, out->n_ints, out->reals, out->n_reals);
        if (w) {
            seen.kept++;
            return w;
        }
        seen.refused++;
        free_packed(out);
    }
    *out = copy_of(corpus + below(n_corpus));
    return mt_network_new(out->ints, out->n_ints, out->reals, out->n_reals);
}

void free_corpus(void)
{
    for (int64_t k = 0; k < n_corpus; k++)
        free_packed(corpus + k);
    free(corpus);
}
