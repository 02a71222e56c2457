/* What the files of the kernel share: the network, the desk a case is worked on, and their functions. */
#ifndef MT_KERNEL_H
#define MT_KERNEL_H

#include <math.h>
#include <stddef.h>
#include <stdint.h>

#include "moletally.h"

#define EPSILON 2.2e-16
#define NOWHERE 1.0 /* mol/m3: the scale of a vessel into which nothing is fed, for want of another */

/* Operations of the register machine; the numbers are those of program.py. */
enum { ADD, SUB, MUL, DIV, POW, MIN, MAX, NEG, SQRT, EXP, LN, LOG10, ABS, OPERATIONS };

typedef struct {
    int32_t op, target, a, b;
} instruction;

/* A step of reverse mode: what register `target` owes to `source`, one of its operands x and y. */
typedef struct {
    int32_t op, second, first; /* derivative by y? first flow into source? */
    int32_t target, source, x, y;
} edge;

/* Rate laws. Registers: leaves (concentrations), T, parameters, literals, results. */
typedef struct {
    int leaves, parameters, literals, registers, terms;
    int prelude, body; /* instructions that no concentration changes, and the others */
    const double *literal;
    const instruction *code;
    const int32_t *output;                /* (terms) register of each rate */
    const int32_t *path_start;            /* (terms + 1) */
    const edge *path;
    const int32_t *entry_start;           /* (terms + 1): derivatives that a term has, by leaf */
    const int32_t *entry_leaf;            /* (entries) */
    const int32_t *entry_read;            /* (entries) 0: the law itself does not read it, its cut does */
} program;

/* Laws cut near zero of some species: factor (c/(c + depth))^power, argument c + depth. */
typedef struct {
    int n;
    const int32_t *species;   /* (n) */
    const double *share;      /* (n) depth over the largest concentration */
    const int32_t *start;     /* (terms + 1) */
    const int32_t *which;     /* of `species` */
    const int32_t *entry;     /* the derivative that the factor adds to */
    const double *power;
} cut;

/* The order of elimination, found once: (I - tau J) keeps its pattern. See linear.c. */
typedef struct {
    int n, length;
    int32_t *program;             /* pivot by pivot, row operations as places in the matrix */
    int32_t *order;               /* (n) pivots */
    int n_lower, n_upper;
    int32_t *lower, *lower_column; /* (n_lower) rows and columns in the order of substitution */
    int32_t *upper, *upper_column; /* (n_upper) */
    int32_t *lower_at, *upper_at; /* their places in the matrix */
    int32_t *row_start, *column;  /* (n + 1) the pattern itself */
    int32_t *memory;
} elimination;

struct mt_network {
    int all, species, reactions, unique;
    const int32_t *present;          /* (species) of all */
    program laws;
    /* from rates of terms to gains: netted by reaction, then spread */
    const int32_t *owner;            /* (terms) */
    const double *sign;              /* (terms) */
    const int32_t *gain_start;       /* (reactions + 1) */
    const int32_t *gain_species;
    const double *gain, *finer;      /* coefficient, and what it lost in rounding */
    int plain;                       /* each reaction is one term, forwards: nothing to net */
    int32_t *maker_start, *maker;    /* (species + 1): the reactions that change a species */
    double *made;                    /* and its coefficients there */
    int n_starved;
    const int32_t *net_start;        /* (reactions + 1): derivatives that a reaction has */
    const int32_t *net_leaf;
    const int32_t *entry_net;        /* (entries) where each derivative of a term is netted */
    const double *order;             /* (terms, species) as c goes to zero */
    cut steady, moving;              /* laws of tanks at rest; of integrators */
    const uint8_t *starved, *wanted; /* (species); (all) */
    uint8_t *ends, *endless;         /* (species) */
    const double *totals;            /* (n_totals, species) */
    int n_totals;
    /* for networks with several states: all laws, by all species */
    int has_whole, absent;
    program whole;
    const int32_t *absent_species;   /* (absent) of all */
    const uint8_t *held;             /* (terms of whole) */
    const double *whole_gain;        /* (terms of whole, absent) */
    elimination plan;
    int nets;                        /* length of net_leaf */
    void *memory[4];
};
typedef struct mt_network network;

/* Scratch memory of one thread: a case at a time. */
typedef struct {
    const network *net;
    double *memory, *next, *end;
    double *registers, *adjoints;    /* of net->laws */
    double *whole_registers;
    double *r, *v, *net_r, *net_v;   /* rates and derivatives of terms, and netted by reaction */
    double *lifted, *share, *rise;
    double *depth_steady, *depth_moving;
    double *jacobian, *matrix, *factors, *diagonal, *probe;
    double *lower, *upper;           /* the factors, packed in the order of substitution */
    double *known_at, *known_slope;  /* the last slope of an explicit step, and where it was taken */
    int known;
    int32_t *pivots;
    int dense;                       /* the last matrix was factored with pivoting */
    double *row_scale, *column_scale;
    double *stages, *a, *b;          /* of integrators */
    int64_t work;                    /* evaluations of all laws */
} desk;

typedef struct {
    const cut *rule;
    const double *depth;
} laws;

/* A vessel's equations: dc/dt = nu' r(c) + (feed - c) exchange; a tube has exchange 0. */
typedef struct {
    laws cut;
    const double *feed;
    double exchange;
} flow;

/* network.c: every desk has room besides for what its methods ask by `take` */
double *take(desk *d, int64_t n);
int desk_open(desk *d, const network *net, int64_t extra);
void desk_close(desk *d);

/* again.c: one vessel that is solved again and again */
typedef struct {
    int (*solve)(void *self);
    void (*close)(void *self);
    const double *feed, *T, *p;
} vessel;
mt_again *keep_vessel(const network *net, void *self, vessel v);

/* program.c */
void bind_case(const program *q, double *registers, double T, const double *p);
void run(const program *q, int from, int to, double *registers, int strict);
void reverse(const program *q, int term, const double *registers, double *adjoints);
void tangent(const program *q, int from, int to, const double *g, double *a, double *b, double *ab);

/* laws.c */
void law_rates(desk *d, laws l, const double *c, double *r);
void law_slopes(desk *d, laws l, const double *c, double *r, double *v);
int laws_defined(desk *d, laws l, const double *c);
int takes_odd_root(desk *d, laws l, const double *c);
int any_low(laws l, const double *c, const uint8_t *among);
void gains(desk *d, const double *r, double *out);
void traffic(const network *net, const double *r, double *out);
void spread_jacobian(desk *d, const double *v, double *jacobian);
void flow_slope(desk *d, const flow *f, const double *c, double *out);
void flow_balance(desk *d, const flow *f, const double *c, double *net, double *gross);
void flow_linear(desk *d, const flow *f, const double *c, double *out, double *jacobian);

/* linear.c */
int plan_elimination(elimination *plan, const network *net);
void forget_elimination(elimination *plan);
void factor_and_solve(desk *d, const double *matrix, const double *size, double *b);
void solve(const desk *d, double *b);
int is_m_matrix(desk *d, const double *matrix);

/* spectrum.c */
int rightmost(double *matrix, int n, double *real, double *imaginary);

/* totals.c */
typedef struct {
    const network *net;
    double *first, *last;
    double exchange;
} totals;
void totals_of(desk *d, totals *t, const double *start, const double *feed, double exchange);
void restore(desk *d, const totals *t, double *c, double time);

/* steady.c */
typedef struct {
    laws laws;
    const double *feed;
    double tau, nothing;
} tank;
int newton(desk *d, const tank *t, double *c, int most, int *iterations);
int vouch(desk *d, const tank *t, const double *c, const uint8_t *gone, double *residual, double *error);
int polish(desk *d, const tank *t, double *c, const uint8_t *gone, double *residual, double *condition,
           double *error);
void tank_matrix(desk *d, const tank *t, const double *c, double *f, double *terms, double *matrix);
void growth(desk *d, const tank *t, const double *c, int known, double *rate, double *swing, int *unstable);
int invaded(desk *d, double T, const double *p, const double *c, double tau);

/* integrators */
typedef struct {
    double relative[2];
    const double *least;
    double scale;
} tolerance;
enum { EXPLICIT, STIFF };
typedef struct {
    double (*root)(double size); /* size^(-1/order of the estimate) */
    int evaluations;
    double most_growth;
    int (*step)(desk *d, const flow *f, const double *c, double h, const double *least, double *after,
                double *error, double *stiffness);
} method;
extern const method METHODS[2];
double missed(desk *d, const tolerance *o, const flow *f, const double *error, const double *before,
              const double *after, int kind, int *finite);
double leaked(desk *d, const tolerance *o, const flow *f, const double *before, const double *after, double h);

typedef struct {
    const flow *flow;
    const tolerance *tolerance;
    const totals *totals;
    double t, h, late, stiff_steps, reviewed, largest;
    double h_before, size_before; /* of the last accepted explicit step */
    double *c, *before, *after, *error; /* (species) */
    double from, stride;                /* the last accepted step: its start and size, from `before` */
    int mode, active, status, steps, most_steps, rejected, last_mode;
    int64_t work;
} stepper;
void stepper_start(desk *d, stepper *s, const flow *f, const tolerance *o, const totals *w, const double *c,
                   int most_steps, int mode);
int attempt(desk *d, stepper *s);

/* startup.c */
typedef struct {
    int status, faded, iterations;
    int64_t work;
} outcome;
void start_up(desk *d, const tank *t, const double *start, const uint8_t *fed, double scale, double *c, outcome *out);
int creep(desk *d, const tank *t, double *c, int *iterations);

#endif
