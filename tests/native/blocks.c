/* Memory of a call: each array a block of just its size; inputs have to come back as they went. */
#include <stdlib.h>

#include "fuzz.h"

#define MOST_BLOCKS 40

typedef struct {
    void *memory;
    size_t size;
    uint64_t digest; /* of an input, before the call; 0: an output */
} block;

static block blocks[MOST_BLOCKS];
static int n_blocks;

uint64_t digest(uint64_t h, const void *memory, size_t size) /* FNV-1a */
{
    for (const unsigned char *p = memory, *end = p + size; p < end; p++)
        h = (h ^ *p) * 1099511628211u;
    return h;
}

void *keep_block(int64_t count, size_t each)
{
    check(n_blocks < MOST_BLOCKS, "too many blocks");
    block *b = blocks + n_blocks++;
    b->size = (size_t)count * each;
    b->memory = malloc(b->size);
    b->digest = 0;
    check(b->memory != NULL, "out of memory");
    return b->memory;
}

const void *sealed(void *memory)
{
    block *b = blocks + n_blocks - 1;
    b->digest = digest(1, memory, b->size);
    return memory;
}

const double *numbers(int64_t count, double from, double to)
{
    double *out = keep_block(count, sizeof *out);
    for (int64_t k = 0; k < count; k++)
        out[k] = any(from, to);
    return sealed(out);
}

const double *temperatures(int64_t count) { return numbers(count, 2.3, 3.0); }

void drop_blocks(void)
{
    for (int k = 0; k < n_blocks; k++) {
        block *b = blocks + k;
        if (b->digest)
            check(b->digest == digest(1, b->memory, b->size), "an input was changed");
        else
            seen.answers = digest(seen.answers, b->memory, b->size);
        free(b->memory);
    }
    n_blocks = 0;
}

/* Of a call that wrote nothing. */
void forget_blocks(void)
{
    while (n_blocks > 0)
        free(blocks[--n_blocks].memory);
}
