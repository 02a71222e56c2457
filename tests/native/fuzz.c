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
#include <stdio.h>
#include <stdlib.h>
#include <unistd.h>

#include "fuzz.h"

#define HANGS_AFTER 120 /* s of one case: no judgement on speed, sanitizers are slow */

tally seen = {.answers = 1469598103934665603u};

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

static void report(void)
{
    printf("networks kept %" PRId64 ", refused %" PRId64 "\n", seen.kept, seen.refused);
    for (int k = 0; k < CALLS; k++)
        printf("%s: %" PRId64 "\n", CALL_NAMES[k], seen.called[k]);
    for (int k = 0; k <= LAST_STATUS; k++)
        printf("status %d: %" PRId64 "\n", k, seen.ended[k]);
    printf("most work: tank %" PRId64 " (case %" PRId64 "), tube %" PRId64 " (case %" PRId64 ")\n", seen.tank_work,
           seen.worst_tank, seen.tube_work, seen.worst_tube);
    printf("most iterations %" PRId64 ", steps %" PRId64 "\n", seen.iterations, seen.steps);
    printf("digest %016" PRIx64 "\n", seen.answers);
}

int main(int argc, char **argv)
{
    if (argc != 2 && argc != 4 && argc != 5) {
        fprintf(stderr, "usage: fuzz CORPUS [SEED COUNT [FIRST]]\n");
        return 2;
    }
    seed = argc > 2 ? strtoll(argv[2], NULL, 10) : 0;
    int64_t count = argc > 2 ? strtoll(argv[3], NULL, 10) : 0, first = argc > 4 ? strtoll(argv[4], NULL, 10) : 0;
    listen();
    read_corpus(argv[1]);
    if (argc == 2)
        sweep();
    for (number = first; number < first + count; number++) {
        chance_state = (uint64_t)seed * 0x100000001b3u + (uint64_t)number;
        chance();
        alarm(HANGS_AFTER);
        run_case();
    }
    alarm(0);
    free_corpus();
    if (count)
        report();
    return 0;
}
