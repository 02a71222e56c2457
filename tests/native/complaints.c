/* What ends the fuzzer, and which case it was. */
#include <inttypes.h>
#include <signal.h>
#include <stdio.h>
#include <stdlib.h>
#include <unistd.h>

#include "fuzz.h"

int64_t seed, number;

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

void check(int holds, const char *what)
{
    if (holds)
        return;
    fprintf(stderr, "fuzz: %s", what);
    say_which();
    exit(2);
}

void listen(void)
{
    signal(SIGALRM, hangs);
    signal(SIGABRT, aborts); /* sanitizers abort where they are told to: abort_on_error=1 */
}
