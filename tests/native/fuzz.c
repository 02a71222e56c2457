/* Feeds the kernel with damaged networks and with all kinds of numbers: fuzz CORPUS SEED COUNT [FIRST]
 * or, without a seed, with every network of the corpus that has one thing wrong: fuzz CORPUS
 *
 * Built with sanitizers (test_sanitizers.py), so that any step outside memory, any undefined operation and
 * any leak ends it. What it asks besides: each call ends with a known status; an answer that is reported
 * fine is finite; inputs stay as they were; the work of a case keeps to its cap. A case follows from SEED
 * and its number alone: `fuzz CORPUS SEED 1 FIRST` repeats number FIRST. Prints counts, the largest work,
 * and a digest of all answers.
 */
#include <inttypes.h>
#include <math.h>
#include <signal.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <unistd.h>

#include "moletally.h"

/* What one case may cost at most, in evaluations of all laws: what the kernel's allowances add up to.
 * Tank: 1500 steps of 13, 375 looks of 32, 20,000 iterations of creep.c, and some 300 before and after.
 * Tube: 12,000 steps of 17 along the mesh, as many of 12 between mesh points, and 17 for each point. */
#define MOST_TANK_WORK 52000
#define MOST_TUBE_WORK 350000
#define MOST_TUBE_STEPS 12000
#define HANGS_AFTER 120 /* s of one case: no judgement on speed, sanitizers are slow */
#define LAST_STATUS MT_STEP_TOO_SMALL
#define MOST_BLOCKS 32

typedef struct {
    int32_t *ints;
    double *reals;
    int64_t n_ints, n_reals;
} packed;

typedef struct {
    void *memory;
    size_t size;
    uint64_t digest; /* of an input, before the call; 0: an output */
} block;

static packed *corpus;
static int64_t n_corpus;
static uint64_t state, answers = 1469598103934665603u;
static int64_t seed, number;
static double severity; /* share of numbers that are nasty */
static block blocks[MOST_BLOCKS];
static int n_blocks;
static int64_t kept, refused, called[8], ended[LAST_STATUS + 1], most_tank_work, most_tube_work, most_iterations,
    most_steps, worst_tank, worst_tube;

static const char *const CALLS[8] = {"tanks", "tanks, short of one thing", "tubes", "tank slopes", "tube slopes",
                                     "rates", "rates and derivatives", "steps"};

/* ---- chance ---- */

static uint64_t chance(void) /* splitmix64, S. Vigna */
{
    uint64_t z = state += 0x9e3779b97f4a7c15u;
    z = (z ^ (z >> 30)) * 0xbf58476d1ce4e5b9u;
    z = (z ^ (z >> 27)) * 0x94d049bb133111ebu;
    return z ^ (z >> 31);
}

static int64_t below(int64_t n) { return n > 0 ? (int64_t)(chance() % (uint64_t)n) : 0; }

static double unit(void) { return (double)(chance() >> 11) / 9007199254740992.0; }

static double nasty(void)
{
    static const double SPECIAL[] = {0.0,   -0.0, 4.9e-324, 1e-310, 1e-300, 1e-200, 1e-30, 1e-16, 1.0,      2.0,      0.5,
                                     -1.0,  1e16, 1e150,    1e200,  1e300,  -1e300, 1e308, 1.79e308, INFINITY, -INFINITY,
                                     NAN,   -1e-300};
    switch (below(4)) {
    case 0: return pow(10.0, 600.0 * unit() - 300.0);
    case 1: return -pow(10.0, 20.0 * unit() - 10.0);
    default: return SPECIAL[below((int64_t)(sizeof SPECIAL / sizeof *SPECIAL))];
    }
}

/* Mostly a plain number between 10^from and 10^to, a zero now and then. */
static double any(double from, double to)
{
    if (unit() < severity)
        return nasty();
    return unit() < 0.2 ? 0.0 : pow(10.0, from + (to - from) * unit());
}

/* ---- complaints ---- */

static void say_which(void)
{
    char text[96];
    int n = snprintf(text, sizeof text, "\nfuzz: seed %" PRId64 ", case %" PRId64 "\n", seed, number);
    if (n > 0 && write(2, text, (size_t)n) < 0)
        return;
}

static void hangs(int signal_number)
{
    static const char TEXT[] = "fuzz: this case does not end";
    (void)signal_number;
    if (write(2, TEXT, sizeof TEXT - 1) > 0)
        say_which();
    _exit(3);
}

static void aborts(int signal_number)
{
    (void)signal_number;
    say_which();
    _exit(4);
}

static void check(int holds, const char *what)
{
    if (holds)
        return;
    fprintf(stderr, "fuzz: %s", what);
    say_which();
    exit(2);
}

/* ---- memory: each array its own block of just its size ---- */

static uint64_t digest(uint64_t h, const void *memory, size_t size) /* FNV-1a */
{
    for (const unsigned char *p = memory, *end = p + size; p < end; p++)
        h = (h ^ *p) * 1099511628211u;
    return h;
}

static void *keep_block(int64_t count, size_t each)
{
    check(n_blocks < MOST_BLOCKS, "too many blocks");
    block *b = blocks + n_blocks++;
    b->size = (size_t)count * each;
    b->memory = malloc(b->size);
    b->digest = 0;
    check(b->memory != NULL, "out of memory");
    return b->memory;
}

static const void *sealed(void *memory)
{
    block *b = blocks + n_blocks - 1;
    b->digest = digest(1, memory, b->size);
    return memory;
}

static const double *numbers(int64_t count, double from, double to)
{
    double *out = keep_block(count, sizeof *out);
    for (int64_t k = 0; k < count; k++)
        out[k] = any(from, to);
    return sealed(out);
}

static const double *temperatures(int64_t count) { return numbers(count, 2.3, 3.0); }

static void drop_blocks(void)
{
    for (int k = 0; k < n_blocks; k++) {
        block *b = blocks + k;
        if (b->digest)
            check(b->digest == digest(1, b->memory, b->size), "an input was changed");
        else
            answers = digest(answers, b->memory, b->size);
        free(b->memory);
    }
    n_blocks = 0;
}

/* ---- networks ---- */

static void read_corpus(const char *name)
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

static void free_packed(packed *p)
{
    free(p->ints);
    free(p->reals);
}

/* The head of a and the tail of b, both cut anywhere; a == b cuts or repeats a piece. */
static packed splice(const packed *a, int64_t ints, int64_t reals, const packed *b, int64_t from_int, int64_t from_real)
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

static packed copy_of(const packed *p) { return splice(p, p->n_ints, p->n_reals, p, p->n_ints, p->n_reals); }

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

static mt_network *damaged_network(packed *out)
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
            kept++;
            return w;
        }
        refused++;
        free_packed(out);
    }
    *out = copy_of(corpus + below(n_corpus));
    return mt_network_new(out->ints, out->n_ints, out->reals, out->n_reals);
}

/* ---- calls ---- */

typedef struct {
    int64_t species, terms, parameters;
} sizes;

static void note_status(int64_t status)
{
    check(status >= 0 && status <= LAST_STATUS, "a status that there is not");
    ended[status]++;
}

static void note_most(int64_t *most, int64_t *worst, int64_t now)
{
    if (now > *most)
        *most = now, *worst = number;
}

static void check_finite(const double *x, int64_t count, const char *what)
{
    for (int64_t k = 0; k < count; k++)
        check(isfinite(x[k]) != 0, what);
}

static void solve_tanks(const mt_network *w, sizes z)
{
    int64_t n = below(4), all = n * z.species;
    mt_tanks t = {.n = n, .how = below(3)};
    t.feed = numbers(all, -3, 2), t.tau = numbers(n, -4, 6), t.T = temperatures(n);
    t.p = numbers(n * z.parameters, -3, 3);
    t.start = below(2) ? numbers(all, -3, 2) : NULL;
    if (below(2)) {
        uint8_t *fed = keep_block(all, 1);
        for (int64_t k = 0; k < all; k++)
            fed[k] = (uint8_t)below(2);
        t.fed = sealed(fed);
    }
    t.scale = below(3) ? NULL : numbers(n, -1, 1);
    t.c = keep_block(all, sizeof(double));
    for (int64_t k = 0; k < all; k++)
        t.c[k] = any(-3, 2);
    t.status = keep_block(n, sizeof(int32_t));
    t.from_start = keep_block(n, 1), t.faded = keep_block(n, 1), t.exhausted = keep_block(all, 1);
    t.residual = keep_block(n, sizeof(double)), t.condition = keep_block(n, sizeof(double));
    t.error = keep_block(n, sizeof(double)), t.root = keep_block(all, sizeof(double));
    t.iterations = keep_block(n, sizeof(int32_t)), t.work = keep_block(n, sizeof(int32_t));
    int code = mt_solve_tanks(w, &t);
    check(code >= 0 && code <= n, "tanks: a return code that there is not");
    for (int64_t k = 0; k < n; k++) {
        note_status(t.status[k]);
        check(t.from_start[k] <= 1 && t.faded[k] <= 1, "tanks: a flag that is none");
        if (t.status[k] == MT_OK && !t.faded[k])
            check_finite(t.c + k * z.species, z.species, "tanks: a fine outlet is not finite");
        check(t.work[k] >= 0 && t.work[k] <= MOST_TANK_WORK, "tanks: more work than allowed");
        note_most(&most_tank_work, &worst_tank, t.work[k]);
        most_iterations = t.iterations[k] > most_iterations ? t.iterations[k] : most_iterations;
    }
}

static void refuse(const mt_network *w)
{
    mt_tanks t = {.n = below(2) ? -1 : 1, .how = MT_FROM_FEED};
    mt_tubes u = {.n = 1, .m = -1};
    mt_slopes s = {.n = 1};
    mt_rates r = {.n = -1};
    if (t.n == 1)
        t.how = below(2) ? 3 : -1;
    check(mt_solve_tanks(w, &t) == MT_BAD_REQUEST && mt_solve_tanks(NULL, &t) == MT_BAD_REQUEST &&
              mt_solve_tanks(w, NULL) == MT_BAD_REQUEST,
          "tanks: a bad request was taken");
    check(mt_solve_tubes(w, &u) == MT_BAD_REQUEST, "tubes: a bad request was taken");
    check(mt_tank_slopes(w, &s) == MT_BAD_REQUEST, "slopes: a bad request was taken");
    check(mt_evaluate(w, &r) == MT_BAD_REQUEST, "rates: a bad request was taken");
    check(!mt_network_new(NULL, 1, NULL, 1) && !mt_network_new((const int32_t[]){0}, -1, (const double[]){0}, 0),
          "a network of nothing");
    mt_network_free(NULL);
}

static void check_tubes(const mt_network *w, mt_tubes t, sizes z)
{
    int64_t points = t.n * t.m;
    t.c = keep_block(points * z.species, sizeof(double)), t.status = keep_block(points, sizeof(int32_t));
    t.exhausted_at = keep_block(t.n * z.species, sizeof(double));
    t.steps = keep_block(t.n, sizeof(int32_t)), t.work = keep_block(t.n, sizeof(int32_t));
    check(mt_solve_tubes(w, &t) == MT_DONE, "tubes: a return code that there is not");
    for (int64_t k = 0; k < points; k++) {
        note_status(t.status[k]);
        if (t.status[k] == MT_OK)
            check_finite(t.c + k * z.species, z.species, "tubes: a fine state is not finite");
    }
    for (int64_t k = 0; k < t.n; k++) {
        check(t.steps[k] >= 0 && t.steps[k] <= MOST_TUBE_STEPS, "tubes: more steps than allowed");
        check(t.work[k] >= 0 && t.work[k] <= MOST_TUBE_WORK, "tubes: more work than allowed");
        note_most(&most_tube_work, &worst_tube, t.work[k]);
        most_steps = t.steps[k] > most_steps ? t.steps[k] : most_steps;
    }
}

static void solve_tubes(const mt_network *w, sizes z)
{
    int64_t n = below(3), m = below(4) ? below(4) : 12;
    mt_tubes t = {.n = n, .m = m};
    t.feed = numbers(n * z.species, -3, 2), t.asked = numbers(n * m, -6, 4), t.T = temperatures(n);
    t.p = numbers(n * z.parameters, -3, 3);
    check_tubes(w, t, z);
}

static void find_slopes(const mt_network *w, sizes z, int of_tubes)
{
    int64_t n = below(3), all = n * z.species;
    mt_slopes s = {.n = n};
    s.feed = numbers(all, -3, 2), s.tau = numbers(n, -4, of_tubes ? 1 : 6), s.T = temperatures(n);
    s.p = numbers(n * z.parameters, -3, 3);
    s.outlet = of_tubes ? NULL : numbers(all, -3, 2);
    s.slope = keep_block(all * (z.species + 2 + z.parameters), sizeof(double));
    s.status = keep_block(n, sizeof(int32_t));
    int code = of_tubes ? mt_tube_slopes(w, &s) : mt_tank_slopes(w, &s);
    check(code == MT_DONE || code == MT_NO_MEMORY, "slopes: a return code that there is not");
    for (int64_t k = 0; k < n && code == MT_DONE; k++)
        note_status(s.status[k]);
    if (code != MT_DONE) /* nothing was written: nothing to digest */
        memset(s.slope, 0, (size_t)(all * (z.species + 2 + z.parameters)) * sizeof(double)),
            memset(s.status, 0, (size_t)n * sizeof(int32_t));
}

static void find_rates(const mt_network *w, sizes z, int derivatives)
{
    int64_t n = below(4), rates = n * z.terms;
    mt_rates r = {.n = n, .strict = below(2)};
    r.c = numbers(n * z.species, -3, 2), r.T = temperatures(n), r.p = numbers(n * z.parameters, -3, 3);
    r.rate = keep_block(rates, sizeof(double));
    if (derivatives) {
        r.by_c = keep_block(rates * z.species, sizeof(double)), r.by_T = keep_block(rates, sizeof(double));
        r.by_p = keep_block(rates * z.parameters, sizeof(double));
    }
    check(mt_evaluate(w, &r) == MT_DONE, "rates: a return code that there is not");
}

/* `present` is the section after the header: states of mt_step have the species that there are. */
static void make_step(const mt_network *w, sizes z, int64_t present)
{
    const double *feed = numbers(present, -3, 2), *p = numbers(z.parameters, -3, 3), *c = numbers(present, -3, 2);
    double *after = keep_block(present, sizeof *after), *error = keep_block(present, sizeof *error);
    check(mt_step(w, (int)below(2), feed, any(2.3, 3), p, c, any(-6, 2), after, error) == MT_DONE,
          "step: a return code that there is not");
    check(mt_step(w, 2, feed, 300.0, p, c, 1.0, after, error) == MT_BAD_REQUEST, "step: a bad request was taken");
}

static void use(const mt_network *w, const packed *p)
{
    sizes z = {p->ints[2], p->ints[4], p->ints[6]};
    int64_t call = below(8);
    called[call]++;
    switch (call) {
    case 0: solve_tanks(w, z); break;
    case 1: refuse(w), solve_tanks(w, z); break;
    case 2: solve_tubes(w, z); break;
    case 3: find_slopes(w, z, 0); break;
    case 4: find_slopes(w, z, 1); break;
    case 5: find_rates(w, z, 0); break;
    case 6: find_rates(w, z, 1); break;
    default: make_step(w, z, p->ints[3]);
    }
    drop_blocks();
}

static void run_case(void)
{
    static const double SEVERITIES[] = {0.0, 0.0, 0.03, 0.2, 1.0};
    packed p;
    mt_network *w;
    severity = SEVERITIES[below(5)];
    if (below(3)) {
        w = damaged_network(&p);
    } else {
        p = copy_of(corpus + below(n_corpus));
        w = mt_network_new(p.ints, p.n_ints, p.reals, p.n_reals);
        check(w != NULL, "a sound network was refused");
    }
    /* the kernel keeps none of what it was handed */
    packed handed = copy_of(&p);
    free_packed(&p);
    for (int64_t k = 1 + below(3); w && k > 0; k--)
        use(w, &handed);
    free_packed(&handed);
    mt_network_free(w);
}

/* ---- sweeps ---- */

/* Linked with --wrap: allocations of the kernel fail where they are told to. */
void *__real_malloc(size_t size);
void *__real_calloc(size_t count, size_t size);
static int64_t fails_at = -1; /* how many allocations succeed before one fails; below 0: none fails */

static int fails(void) { return fails_at >= 0 && fails_at-- == 0; }

void *__wrap_malloc(size_t size) { return fails() ? NULL : __real_malloc(size); }
void *__wrap_calloc(size_t count, size_t size) { return fails() ? NULL : __real_calloc(count, size); }

/* A call with each of its allocations failing in turn has to say so; returns how many it makes. */
static int without_memory(const mt_network *w, sizes z, int which)
{
    severity = 0.0;
    for (int k = 0; k < 100; k++) {
        const double *feed = numbers(z.species, -3, 2), *p = numbers(z.parameters, -3, 3), *T = temperatures(1);
        double *x = keep_block(z.species * (z.species + 2 + z.parameters) + z.terms + 1, sizeof *x), y[4];
        uint8_t *u = keep_block(z.species + 1, 1), b[2];
        int32_t i[3];
        mt_tanks tanks = {1, MT_FROM_FEED, feed, T, T, p, NULL, NULL, NULL, x, i, b, b + 1, u, y, y + 1, y + 2,
                          x + z.species, i + 1, i + 2};
        mt_tubes tubes = {1, 1, feed, T, T, p, x, i, x + z.species, i + 1, i + 2};
        mt_slopes slopes = {1, feed, T, T, p, feed, x, i};
        mt_rates rates = {1, 0, feed, T, p, x, NULL, NULL, NULL};
        fails_at = k;
        int code = which == 0   ? mt_solve_tanks(w, &tanks)
                   : which == 1 ? mt_solve_tubes(w, &tubes)
                   : which == 2 ? mt_tank_slopes(w, &slopes)
                   : which == 3 ? mt_tube_slopes(w, &slopes)
                   : which == 4 ? mt_evaluate(w, &rates)
                                : mt_step(w, 0, feed, 300.0, p, feed, 1.0, x, x + z.species);
        int spared = fails_at >= 0;
        fails_at = -1;
        for (int j = 0; j < n_blocks; j++)
            free(blocks[j].memory);
        n_blocks = 0;
        if (spared)
            return k;
        check(code == MT_NO_MEMORY, "out of memory was not told");
    }
    return 0;
}

/* Three hundred points, closer than the steps of a tube of the first species alone: where a long step damps a fast
 * transient the points are reached by steps of their own. */
static void profile(const mt_network *w, sizes z)
{
    severity = 0.0;
    mt_tubes t = {.n = 1, .m = 300};
    double *feed = keep_block(z.species, sizeof *feed);
    for (int64_t i = 0; i < z.species; i++)
        feed[i] = i ? 0.0 : 30.786;
    t.feed = sealed(feed);
    double *asked = keep_block(t.m, sizeof *asked);
    for (int64_t k = 0; k < t.m; k++)
        asked[k] = 3.78e-9 * pow(10.0, 6.0 * (double)k / (double)(t.m - 1));
    t.asked = sealed(asked);
    t.T = temperatures(1), t.p = numbers(z.parameters, -1, 1);
    check_tubes(w, t, z);
    drop_blocks();
}

/* A hundred thousand parameters that nothing reads: their derivatives ask for more than a machine has. */
static void ask_too_much(const packed *p)
{
    packed large = copy_of(p);
    sizes z = {p->ints[2], p->ints[4], large.ints[6] = 100000};
    mt_network *w = mt_network_new(large.ints, large.n_ints, large.reals, large.n_reals);
    if (w) { /* else it has instructions, whose registers are others now */
        mt_slopes s = {.n = 1};
        s.feed = s.outlet = numbers(z.species, -3, 2), s.tau = s.T = temperatures(1), s.p = numbers(z.parameters, 0, 1);
        s.slope = keep_block(z.species * (z.species + 2 + z.parameters), sizeof(double));
        s.status = keep_block(1, sizeof(int32_t));
        check(mt_tube_slopes(w, &s) == MT_NO_MEMORY && mt_tank_slopes(w, &s) == MT_NO_MEMORY, "too much was taken");
        memset(s.slope, 0, blocks[n_blocks - 2].size), s.status[0] = 0; /* nothing was written: nothing to digest */
        drop_blocks();
    }
    free_packed(&large);
    mt_network_free(w);
}

static int64_t starve(const packed *p)
{
    mt_network *w = NULL;
    int64_t failed = 0;
    for (int64_t k = 0; !w; k++) {
        fails_at = k;
        w = mt_network_new(p->ints, p->n_ints, p->reals, p->n_reals);
        check((w != NULL) == (fails_at >= 0), "out of memory was not told");
        failed += !w;
    }
    fails_at = -1;
    profile(w, (sizes){p->ints[2], p->ints[4], p->ints[6]});
    for (int which = 0; which < 6; which++)
        failed += without_memory(w, (sizes){p->ints[2], p->ints[4], p->ints[6]}, which);
    mt_network_free(w);
    return failed;
}

/* Sound networks with one thing wrong, one after the other: each has to be refused. */
static void sweep(void)
{
    static const int32_t WRONG[] = {-1, INT32_MAX, INT32_MIN};
    int64_t tried = 0, starved = 0;
    for (const packed *p = corpus; p < corpus + n_corpus; p++) {
        number = p - corpus;
        starved += starve(p);
        ask_too_much(p);
        for (int64_t k = 0; k <= p->n_ints + p->n_reals + 1; k++, tried++) { /* too short by k, or too long by one */
            int64_t ints = k < p->n_ints ? k : p->n_ints, reals = k < p->n_ints ? p->n_reals : k - p->n_ints;
            if (reals == p->n_reals && ints == p->n_ints)
                continue;
            packed whole = splice(p, p->n_ints, p->n_reals, p, p->n_ints - 1, 0); /* so that too long can be read */
            packed damaged = splice(&whole, ints, reals, p, p->n_ints, p->n_reals);
            check(!mt_network_new(damaged.ints, ints, damaged.reals, reals), "a network of another length was taken");
            free_packed(&damaged);
            free_packed(&whole);
        }
        for (int64_t k = 0; k < p->n_ints; k++)
            for (int j = 0; j < 3; j++, tried++) {
                packed damaged = copy_of(p);
                damaged.ints[k] = WRONG[j];
                check(!mt_network_new(damaged.ints, p->n_ints, damaged.reals, p->n_reals), "a wrong int was taken");
                free_packed(&damaged);
            }
    }
    printf("refused, one by one: %" PRId64 ", for want of memory: %" PRId64 "\n", tried, starved);
}

static void report(void)
{
    printf("networks kept %" PRId64 ", refused %" PRId64 "\n", kept, refused);
    for (int k = 0; k < 8; k++)
        printf("%s: %" PRId64 "\n", CALLS[k], called[k]);
    for (int k = 0; k <= LAST_STATUS; k++)
        printf("status %d: %" PRId64 "\n", k, ended[k]);
    printf("most work: tank %" PRId64 " (case %" PRId64 "), tube %" PRId64 " (case %" PRId64 ")\n", most_tank_work,
           worst_tank, most_tube_work, worst_tube);
    printf("most iterations %" PRId64 ", steps %" PRId64 "\n", most_iterations, most_steps);
    printf("digest %016" PRIx64 "\n", answers);
}

int main(int argc, char **argv)
{
    if (argc != 2 && argc != 4 && argc != 5) {
        fprintf(stderr, "usage: fuzz CORPUS [SEED COUNT [FIRST]]\n");
        return 2;
    }
    seed = argc > 2 ? strtoll(argv[2], NULL, 10) : 0;
    int64_t count = argc > 2 ? strtoll(argv[3], NULL, 10) : 0, first = argc > 4 ? strtoll(argv[4], NULL, 10) : 0;
    signal(SIGALRM, hangs);
    signal(SIGABRT, aborts); /* sanitizers abort where they are told to: abort_on_error=1 */
    read_corpus(argv[1]);
    if (argc == 2)
        sweep();
    for (number = first; number < first + count; number++) {
        state = (uint64_t)seed * 0x100000001b3u + (uint64_t)number;
        chance();
        alarm(HANGS_AFTER);
        run_case();
    }
    alarm(0);
    for (int64_t k = 0; k < n_corpus; k++)
        free_packed(corpus + k);
    free(corpus);
    if (count)
        report();
    return 0;
}
