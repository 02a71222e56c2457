/* Reads a network from its two flat arrays, checks every number that is used as an index, and makes desks.
 *
 * After mt_network_new no index is checked again: whatever the arrays said, no program reads a register
 * that is not there or one that is computed later.
 */
#include <stdlib.h>
#include <string.h>

#include "kernel.h"

#define MOST 100000       /* of anything: far above a workbook's needs, far below overflow of a product */
#define MOST_SPECIES 3000 /* matrices are stored dense */
#define MOST_ROOM ((int64_t)1 << 27) /* doubles of a desk: derivatives take parameters times registers of them */

typedef struct {
    const int32_t *i, *i_end;
    const double *x, *x_end;
    int bad;
} reader;

static const int32_t NO_INTS[1] = {0};
static const double NO_REALS[1] = {0};

/* A section of ints: its length, then numbers of lo..hi; expected < 0: any length. */
static const int32_t *ints(reader *in, int64_t expected, int32_t lo, int32_t hi, int *length)
{
    if (length)
        *length = 0;
    if (in->bad || in->i_end - in->i < 1 || in->i[0] < 0 || in->i_end - in->i - 1 < in->i[0] ||
        (expected >= 0 && in->i[0] != expected)) {
        in->bad = 1;
        return NO_INTS;
    }
    int32_t n = in->i[0];
    const int32_t *out = in->i + 1;
    in->i += 1 + n;
    for (int32_t k = 0; k < n; k++)
        if (out[k] < lo || out[k] > hi)
            in->bad = 1;
    if (length)
        *length = n;
    return out;
}

static const double *reals(reader *in, int64_t expected)
{
    if (in->bad || in->x_end - in->x < expected) {
        in->bad = 1;
        return NO_REALS;
    }
    const double *out = in->x;
    in->x += expected;
    return out;
}

/* Starts of lists: rising, from 0 to `total`. */
static const int32_t *starts(reader *in, int rows, int64_t total_known, int *total)
{
    const int32_t *s = ints(in, (int64_t)rows + 1, 0, INT32_MAX, NULL);
    *total = 0;
    if (in->bad)
        return NO_INTS;
    for (int k = 0; k < rows; k++)
        if (s[k + 1] < s[k])
            in->bad = 1;
    if (s[0] != 0 || (total_known >= 0 && s[rows] != total_known))
        in->bad = 1;
    *total = in->bad ? 0 : s[rows];
    return s;
}

/* Reverse mode passes on only what has arrived: every edge starts at a register that the term's own result or an
 * edge before it has reached, `first` says truly whether it is the first to reach its end, and derivatives are
 * read where something has arrived. Else a term would be handed what another one, or nobody, has left there. */
static void check_paths(reader *in, const program *q)
{
    int32_t *reached = in->bad ? NULL : calloc((size_t)q->registers, sizeof *reached); /* by which term, from 1 */
    if (!reached) {
        in->bad = 1;
        return;
    }
    for (int t = 0; t < q->terms; t++) {
        int32_t mark = t + 1;
        reached[q->output[t]] = mark;
        for (int k = q->path_start[t]; k < q->path_start[t + 1]; k++) {
            const edge *e = q->path + k;
            if (reached[e->target] != mark || e->first != (reached[e->source] != mark))
                in->bad = 1;
            reached[e->source] = mark;
        }
        for (int k = q->entry_start[t]; k < q->entry_start[t + 1]; k++)
            if (q->entry_read[k] && reached[q->entry_leaf[k]] != mark)
                in->bad = 1;
    }
    free(reached);
}

static void read_program(reader *in, program *q)
{
    int first_result = q->leaves + 1 + q->parameters + q->literals, count = q->prelude + q->body, total;
    q->registers = first_result + count;
    int top = q->registers > OPERATIONS ? q->registers : OPERATIONS;
    q->code = (const instruction *)ints(in, 4 * (int64_t)count, 0, top - 1, NULL);
    for (int k = 0; !in->bad && k < count; k++) {
        const instruction *s = q->code + k;
        if (s->op >= OPERATIONS || s->target != first_result + k || s->a >= s->target || s->b >= s->target)
            in->bad = 1;
    }
    q->output = ints(in, q->terms, 0, q->registers - 1, NULL);
    q->path_start = starts(in, q->terms, -1, &total);
    q->path = (const edge *)ints(in, 7 * (int64_t)total, 0, top - 1, NULL);
    for (int k = 0; !in->bad && k < total; k++) {
        const edge *e = q->path + k;
        int largest = e->target > e->source ? e->target : e->source, operand = e->x > e->y ? e->x : e->y;
        if (e->op >= OPERATIONS || e->second > 1 || e->first > 1 || largest >= q->registers || operand >= q->registers)
            in->bad = 1;
    }
    q->entry_start = starts(in, q->terms, -1, &total);
    q->entry_leaf = ints(in, total, 0, q->leaves - 1, NULL);
    q->entry_read = ints(in, total, 0, 1, NULL);
    q->literal = reals(in, q->literals);
    check_paths(in, q);
}

static void read_cut(reader *in, const network *w, cut *c)
{
    int total;
    c->species = ints(in, -1, 0, w->species - 1, &c->n);
    c->start = starts(in, w->laws.terms, -1, &total);
    c->which = ints(in, total, 0, c->n - 1, NULL);
    int entries = in->bad ? 0 : w->laws.entry_start[w->laws.terms];
    c->entry = ints(in, total, 0, entries - 1, NULL);
    c->share = reals(in, c->n);
    c->power = reals(in, total);
}

static void read_whole(reader *in, network *w)
{
    program *q = &w->whole;
    const int32_t *size = ints(in, 4, 0, MOST, NULL);
    if (in->bad)
        return;
    q->leaves = w->all;
    q->parameters = w->laws.parameters;
    q->literals = size[0], q->prelude = size[1], q->body = size[2], q->terms = size[3];
    read_program(in, q);
    w->absent_species = ints(in, w->absent, 0, w->all - 1, NULL);
    const int32_t *held = ints(in, q->terms, 0, 1, NULL);
    w->whole_gain = reals(in, (int64_t)q->terms * w->absent);
    uint8_t *flags = malloc((size_t)q->terms + 1);
    w->memory[2] = flags;
    if (!flags) {
        in->bad = 1;
        return;
    }
    for (int k = 0; !in->bad && k < q->terms; k++)
        flags[k] = (uint8_t)held[k];
    w->held = flags;
}

#define ZERO_ORDER 1e-9 /* orders are exact but for rounding */

/* What follows from orders: species that a law of an order below one, or of a negative one, consumes. */
static void read_flags(reader *in, network *w, uint8_t *flags)
{
    int S = w->species;
    const int32_t *starved = ints(in, S, 0, 1, NULL), *wanted = ints(in, w->all, 0, 1, NULL);
    uint8_t *s = flags, *v = flags + S, *ends = v + w->all, *endless = ends + S;
    w->starved = s, w->wanted = v, w->ends = ends, w->endless = endless;
    if (in->bad)
        return;
    for (int i = 0; i < S; i++)
        s[i] = (uint8_t)starved[i], ends[i] = endless[i] = 0;
    for (int i = 0; i < w->all; i++)
        v[i] = (uint8_t)wanted[i];
    for (int t = 0; t < w->laws.terms; t++) {
        int j = w->owner[t];
        for (int k = w->gain_start[j]; k < w->gain_start[j + 1]; k++)
            if (w->sign[t] * w->gain[k] < 0) {
                int i = w->gain_species[k];
                double q = w->order[(int64_t)t * S + i];
                ends[i] |= q < 1 - ZERO_ORDER;
                endless[i] |= q < -ZERO_ORDER;
            }
    }
}

/* The same coefficients by species: what a species gains is summed in a register, not in memory. */
static int list_makers(network *w)
{
    int S = w->species, total = w->gain_start[w->reactions], at = 0;
    double *made = malloc((size_t)total * (sizeof(double) + sizeof(int32_t)) + ((size_t)S + 1) * sizeof(int32_t));
    w->memory[3] = made;
    if (!made)
        return 0;
    w->made = made;
    w->maker = (int32_t *)(made + total);
    w->maker_start = w->maker + total;
    for (int i = 0; i < S; i++) {
        w->maker_start[i] = at;
        for (int j = 0; j < w->reactions; j++)
            for (int k = w->gain_start[j]; k < w->gain_start[j + 1]; k++)
                if (w->gain_species[k] == i)
                    w->maker[at] = j, made[at++] = w->gain[k];
    }
    w->maker_start[S] = at;
    w->plain = w->laws.terms == w->reactions;
    for (int t = 0; t < w->laws.terms; t++)
        w->plain &= w->owner[t] == t && w->sign[t] == 1;
    for (int i = 0; i < S; i++)
        w->n_starved += w->starved[i];
    return 1;
}

static int read_network(reader *in, network *w)
{
    const int32_t *h = ints(in, 13, 0, MOST, NULL);
    if (in->bad || h[0] != MT_FORMAT)
        return 0;
    program *q = &w->laws;
    w->all = h[1], w->species = q->leaves = h[2], q->terms = h[3], w->reactions = h[4];
    q->parameters = h[5], q->literals = h[6], q->prelude = h[7], q->body = h[8];
    if (w->all > MOST_SPECIES || w->species > w->all || w->absent > w->all)
        return 0;
    w->unique = h[9], w->n_totals = h[10], w->has_whole = h[11], w->absent = h[12];
    if (w->n_totals > w->all) /* a basis of totals has no more; a desk has room for their square */
        return 0;
    w->present = ints(in, w->species, 0, w->all - 1, NULL);
    read_program(in, q);
    int entries = in->bad ? 0 : q->entry_start[q->terms], total;
    w->owner = ints(in, q->terms, 0, w->reactions - 1, NULL);
    w->gain_start = starts(in, w->reactions, -1, &total);
    w->gain_species = ints(in, total, 0, w->species - 1, NULL);
    w->gain = reals(in, total);
    w->finer = reals(in, total);
    w->net_start = starts(in, w->reactions, -1, &w->nets);
    w->net_leaf = ints(in, w->nets, 0, w->species - 1, NULL);
    w->entry_net = ints(in, entries, 0, w->nets - 1, NULL);
    w->sign = reals(in, q->terms);
    w->order = reals(in, (int64_t)q->terms * w->species);
    read_cut(in, w, &w->steady);
    read_cut(in, w, &w->moving);
    uint8_t *flags = malloc(3 * (size_t)w->species + (size_t)w->all + 1);
    w->memory[1] = flags;
    if (!flags)
        return 0;
    read_flags(in, w, flags);
    w->totals = reals(in, (int64_t)w->n_totals * w->species);
    if (w->has_whole)
        read_whole(in, w);
    return !in->bad && in->i == in->i_end && in->x == in->x_end;
}

int mt_format(void) { return MT_FORMAT; }

mt_network *mt_network_new(const int32_t *given, int64_t n_ints, const double *numbers, int64_t n_reals)
{
    if (!given || !numbers || n_ints < 0 || n_reals < 0 || n_ints > 1 << 28 || n_reals > 1 << 28)
        return NULL;
    network *w = calloc(1, sizeof *w);
    /* one block for both arrays, doubles first for their alignment */
    char *copy = malloc((size_t)n_reals * sizeof(double) + (size_t)n_ints * sizeof(int32_t) + 1);
    if (!w || !copy) {
        free(w);
        free(copy);
        return NULL;
    }
    double *x = (double *)copy;
    int32_t *i = (int32_t *)(copy + (size_t)n_reals * sizeof(double));
    memcpy(x, numbers, (size_t)n_reals * sizeof(double));
    memcpy(i, given, (size_t)n_ints * sizeof(int32_t));
    w->memory[0] = copy;
    reader in = {i, i + n_ints, x, x + n_reals, 0};
    if (!read_network(&in, w) || !list_makers(w) || !plan_elimination(&w->plan, w)) {
        mt_network_free(w);
        return NULL;
    }
    return w;
}

void mt_network_free(mt_network *w)
{
    if (!w)
        return;
    forget_elimination(&w->plan);
    for (int k = 0; k < 4; k++)
        free(w->memory[k]);
    free(w);
}

/* n doubles of the desk, to be used until it is closed or `next` is set back. */
double *take(desk *d, int64_t n)
{
    double *out = d->next;
    d->next += n;
    return out;
}

/* Makes a desk: room for all methods, each of which takes some arrays of `species`, and `extra` doubles. */
int desk_open(desk *d, const network *w, int64_t extra)
{
    int64_t S = w->species, F = w->laws.terms, entries = w->laws.entry_start[F], R = w->reactions;
    int64_t cuts = w->steady.n > w->moving.n ? w->steady.n : w->moving.n;
    int64_t whole = w->has_whole ? 2 * (int64_t)w->whole.registers + (int64_t)w->absent * (w->absent + 4) : 0;
    int64_t sums = (int64_t)w->n_totals * (w->n_totals + 6) + S;
    int64_t need = 2 * (int64_t)w->laws.registers + F + entries + R + w->nets + S + 2 * cuts + w->steady.n +
                   w->moving.n + 3 * S * S + (21 + 60) * S + whole + sums + 2 * S + w->plan.n_lower + w->plan.n_upper + 2 * w->n_totals + 64 + extra;
    memset(d, 0, sizeof *d);
    if (need > MOST_ROOM) /* systems that promise more than they have would let it be filled until they end us */
        return 0;
    d->net = w;
    d->memory = malloc((size_t)need * sizeof(double));
    d->pivots = malloc((size_t)(S + 1) * sizeof(int32_t));
    if (!d->memory || !d->pivots) {
        desk_close(d);
        return 0;
    }
    d->next = d->memory;
    d->end = d->memory + need;
    d->registers = take(d, w->laws.registers);
    d->adjoints = take(d, w->laws.registers);
    d->r = take(d, F);
    d->v = take(d, entries);
    d->net_r = take(d, R);
    d->net_v = take(d, w->nets);
    d->lifted = take(d, S);
    d->share = take(d, cuts);
    d->rise = take(d, cuts);
    d->depth_steady = take(d, w->steady.n);
    d->depth_moving = take(d, w->moving.n);
    d->jacobian = take(d, S * S);
    d->matrix = take(d, S * S);
    d->factors = take(d, S * S);
    d->diagonal = take(d, S);
    d->probe = take(d, S);
    d->lower = take(d, w->plan.n_lower);
    d->upper = take(d, w->plan.n_upper);
    d->known_at = take(d, S);
    d->known_slope = take(d, S);
    d->row_scale = take(d, S);
    d->column_scale = take(d, S);
    d->stages = take(d, 12 * S);
    d->a = take(d, 2 * S);
    d->b = take(d, 2 * S);
    if (w->has_whole)
        d->whole_registers = take(d, whole);
    return 1;
}

void desk_close(desk *d)
{
    free(d->memory);
    free(d->pivots);
    d->memory = NULL;
    d->pivots = NULL;
}
