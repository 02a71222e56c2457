/* Numbers by chance: always the same from the same state. */
#include <math.h>

#include "fuzz.h"

uint64_t chance_state;
double severity;

uint64_t chance(void) /* splitmix64, S. Vigna */
{
    uint64_t z = chance_state += 0x9e3779b97f4a7c15u;
    z = (z ^ (z >> 30)) * 0xbf58476d1ce4e5b9u;
    z = (z ^ (z >> 27)) * 0x94d049bb133111ebu;
    return z ^ (z >> 31);
}

int64_t below(int64_t n) { return n > 0 ? (int64_t)(chance() % (uint64_t)n) : 0; }

double unit(void) { return (double)(chance() >> 11) / 9007199254740992.0; }

double nasty(void)
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
double any(double from, double to)
{
    if (unit() < severity)
        return nasty();
    return unit() < 0.2 ? 0.0 : pow(10.0, from + (to - from) * unit());
}
