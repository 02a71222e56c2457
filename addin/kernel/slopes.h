/* What derivatives of tanks and of tubes share. */
#ifndef MT_SLOPES_H
#define MT_SLOPES_H

#include "kernel.h"

/* Columns are numbered: feed of species 0.., tau, T, parameter 0.. */
typedef struct {
    desk *d;
    laws l;
    int columns;          /* that are carried: species, then T, then parameters */
    double *prelude;      /* (1 + parameters, registers): how all that is fixed changes */
    double *a, *b, *ab;   /* (registers) tangents */
    double *base;         /* (registers) the laws at the start of a step */
    double *ra, *rab;     /* (terms) */
} tangents;

int64_t tangent_room(const network *w);
void open_tangents(tangents *x, desk *d, laws l);
void bind_tangents(tangents *x);
void place_tangents(tangents *x, const double *c, double *r);
void slope_tangent(tangents *x, const double *g, const double *c, const double *direction, int column, double *out);
void jacobian_tangent(tangents *x, const double *g, const double *c, const double *direction, int column,
                      const double *vector, double *out);
void write_column(const network *w, const mt_slopes *all, int64_t row, int place_of, const double *x);
void write_absent(const network *w, const mt_slopes *all, int64_t row);
int column_place(const network *w, int column);
int are_finite(const double *x, int n);
void begin_slopes(desk *d, const mt_slopes *all, int64_t row, const cut *rule, double *depth, double *feed,
                  double *scale);
int slopes_complete(const network *w, const mt_slopes *a);

#endif
