/* The interface of the compiled kernel: what Python calls.
 *
 * A network is what the analysis of a reaction network leaves to be computed: rate laws as a register
 * program, who gains what from each, where laws are cut. It is handed over as two flat arrays, checked
 * whole, and never changes: any number of threads may use one. Vessels come in batches, a row per case;
 * arrays are row-major, all quantities in SI. No call keeps a pointer, none writes outside the arrays
 * it is given, and none stops the process, whatever the numbers in them are.
 */
#ifndef MOLETALLY_H
#define MOLETALLY_H

#include <stdint.h>

#if defined(_WIN32)
#define MT_API __declspec(dllexport)
#else
#define MT_API __attribute__((visibility("default")))
#endif

#define MT_FORMAT 1 /* of the flat arrays; the binding refuses another */

/* How a case ended; the same numbers as in status.py. */
enum {
    MT_OK = 0,
    MT_NOT_CONVERGED = 1,
    MT_WORK_CAP = 2,
    MT_NOT_FINITE = 3,
    MT_UNBOUNDED_AT_ZERO = 4,
    MT_UNSTABLE = 5,
    MT_OSCILLATES = 6,
    MT_RESIDUAL = 7,
    MT_NEGATIVE = 8,
    MT_INVARIANT = 9,
    MT_ILL_CONDITIONED = 10,
    MT_BLOW_UP = 11,
    MT_STEP_TOO_SMALL = 12
};

/* What a call returns; mt_solve_tanks returns more than MT_DONE: how many of its answers call for a second
 * look, being refused, doubtful beyond a relative 1e-10, faded, or with species used up. */
enum { MT_DONE = 0, MT_NO_MEMORY = -1, MT_BAD_REQUEST = -2, MT_CHANGED = -3 };

typedef struct mt_network mt_network;

/* How a batch of tanks is to be solved. */
enum {
    MT_FROM_FEED = 0, /* the state that a start-up from `start` reaches */
    MT_FROM_GUESS = 1, /* the state that Newton's method reaches from `c`; no start-up */
    MT_CHECK_ONLY = 2 /* `c` is the state, exact to the last digit: only check it */
};

/* N tanks of one network; S: all its species, P: its parameters. */
typedef struct {
    int64_t n, how;
    const double *feed;  /* (N, S) mol/m3 */
    const double *tau;   /* (N) s, > 0 */
    const double *T;     /* (N) K */
    const double *p;     /* (N, P) */
    const double *start; /* (N, S) first contents, or NULL: full of feed */
    const uint8_t *fed;  /* (N, S) species that the feed alone brings about, or NULL: all */
    const double *scale; /* (N) mol/m3, or NULL: the largest concentration of feed and start */
    double *c;           /* (N, S) outlets; nan where the case failed */
    int32_t *status;     /* (N) */
    uint8_t *from_start; /* (N) a start-up chose the state */
    uint8_t *faded;      /* (N) what was there at the start only has been washed out: not solved */
    uint8_t *exhausted;  /* (N, S) used up by laws of order zero */
    double *residual;    /* (N) over the sum of a balance's terms */
    double *condition;   /* (N), or NULL: not asked for, which saves a fifth of the time */
    double *error;       /* (N) estimated relative error of an outlet, before it was judged */
    double *root;        /* (N, S) the outlet as it was before it was judged */
    int32_t *iterations, *work; /* (N) */
} mt_tanks;

/* N tubes of one network at M residence times each. */
typedef struct {
    int64_t n, m;
    const double *feed;  /* (N, S) */
    const double *asked; /* (N, M) s, in any order */
    const double *T;     /* (N) */
    const double *p;     /* (N, P) */
    double *c;           /* (N, M, S) */
    int32_t *status;     /* (N, M) */
    double *exhausted_at; /* (N, S) s, or nan */
    int32_t *steps, *work; /* (N) */
} mt_tubes;

/* Derivatives of outlets by feed (S), tau, T and parameters (P), in this order: Q = S + 2 + P. */
typedef struct {
    int64_t n;
    const double *feed, *tau, *T, *p; /* as above */
    const double *outlet; /* (N, S) of solved tanks; NULL for tubes */
    double *slope;        /* (N, S, Q); nan where there is none */
    int32_t *status;      /* (N) */
} mt_slopes;

/* Rates of all terms of one network. */
typedef struct {
    int64_t n, strict;
    const double *c, *T, *p;
    double *rate;                    /* (N, F) */
    double *by_c, *by_T, *by_p;      /* (N, F, S), (N, F), (N, F, P), or all NULL */
} mt_rates;

MT_API int mt_format(void);
MT_API mt_network *mt_network_new(const int32_t *ints, int64_t n_ints, const double *reals, int64_t n_reals);
MT_API void mt_network_free(mt_network *network);
MT_API int mt_solve_tanks(const mt_network *network, const mt_tanks *tanks);
MT_API int mt_solve_tubes(const mt_network *network, const mt_tubes *tubes);
MT_API int mt_tank_slopes(const mt_network *network, const mt_slopes *slopes);
MT_API int mt_tube_slopes(const mt_network *network, const mt_slopes *slopes);
MT_API int mt_evaluate(const mt_network *network, const mt_rates *rates);
/* One vessel solved again and again: memory is taken once, and what depends on T and p alone is kept. The
 * record and its arrays stay the caller's and must live as long; n is 1. `solve` returns MT_CHANGED, and does
 * nothing, where T, p or which species are fed differ from what they were: the network may be another then. */
typedef struct mt_again mt_again;
MT_API mt_again *mt_tank_again(const mt_network *network, const mt_tanks *tank);
MT_API mt_again *mt_tube_again(const mt_network *network, const mt_tubes *tube);
MT_API int mt_again_solve(mt_again *again);
MT_API void mt_again_free(mt_again *again);
/* One step of size h from c: method 0 explicit, 1 stiff; for tests against the other engine. */
MT_API int mt_step(const mt_network *network, int method, const double *feed, double T, const double *p,
                   const double *c, double h, double *after, double *error);

#endif
