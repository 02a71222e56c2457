/* What the files of the fuzzer share; fuzz.c says what it is for. */
#ifndef FUZZ_H
#define FUZZ_H

#include <stdint.h>
#include <stddef.h>

#include "moletally.h"

#define LAST_STATUS MT_STEP_TOO_SMALL
#define CALLS 9

/* A network as the kernel is handed it, and what its header says about the arrays of its cases. */
typedef struct {
    int32_t *ints;
    double *reals;
    int64_t n_ints, n_reals;
} packed;
typedef struct {
    int64_t species, terms, parameters;
} sizes;

/* What was seen, for the report. */
typedef struct {
    int64_t kept, refused, called[CALLS], ended[LAST_STATUS + 1];
    int64_t tank_work, tube_work, iterations, steps, worst_tank, worst_tube;
    uint64_t answers; /* a digest of all outputs */
} tally;
extern tally seen;
extern int64_t seed, number; /* of the case at hand */

/* chance.c */
extern uint64_t chance_state;
extern double severity; /* share of numbers that are nasty */
uint64_t chance(void);
int64_t below(int64_t n);
double unit(void);
double nasty(void);
double any(double from, double to);

/* complaints.c */
void listen(void);
void check(int holds, const char *what);

/* blocks.c: every array in a block of just its size */
uint64_t digest(uint64_t h, const void *memory, size_t size);
void *keep_block(int64_t count, size_t each);
const void *sealed(void *memory);
const double *numbers(int64_t count, double from, double to);
const double *temperatures(int64_t count);
void drop_blocks(void);
void forget_blocks(void);

/* networks.c */
extern packed *corpus;
extern int64_t n_corpus;
void read_corpus(const char *name);
void free_corpus(void);
void free_packed(packed *p);
packed splice(const packed *a, int64_t ints, int64_t reals, const packed *b, int64_t from_int, int64_t from_real);
packed copy_of(const packed *p);
sizes sizes_of(const packed *p);
mt_network *damaged_network(packed *out);

/* calls.c */
extern const char *const CALL_NAMES[CALLS];
void use(const mt_network *w, const packed *p);
mt_tubes check_tubes(const mt_network *w, mt_tubes t, sizes z);

/* sweeps.c */
void sweep(void);

#endif
