#include "read/even.h"

#include <math.h>
#include <stdbool.h>

/* Allowances, in steps of the grid, beyond what the printed resolution explains; common practice. A
 * lost row is a step of 2; clocks that count in single precision err by less than a quarter. */
#define STEP_MOST 0.25
#define GRID_MOST 0.5
#define ALIKE 50 /* so many equal steps and then a longer one: rows were lost, not rounded */
#define LONGER 1.9

static void note(struct even *even, struct decimal_grain grain)
{
    if (grain.fraction <= even->fraction && grain.significant <= even->significant)
        return;
    if (grain.fraction > even->fraction)
        even->fraction = grain.fraction;
    if (grain.significant > even->significant)
        even->significant = grain.significant;
    even->low = even->high = 0; /* no decade is known */
}

static bool breaks_row(struct even *even, double step)
{
    const bool alike = even->equal > 0 && fabs(step - even->usual) <= 1e-6 * even->step;
    const bool lost = even->equal >= ALIKE && even->usual > 0 && step > LONGER * even->usual;
    even->equal = alike ? even->equal + 1 : 1;
    even->usual = step;
    return lost;
}

/* Resolution of a printed time, s: the coarser of a fixed number of decimals and a fixed number of
 * significant digits. Zeros that were dropped at the end of one text are known from the others. */
static double resolution(struct even *even, double time)
{
    const double value = fabs(time / even->unit);
    if (value >= even->low && value < even->high)
        return even->fine;
    const double decimals = pow(10, -even->fraction);
    double digits = decimals;
    if (value > 0) {
        const double decade = floor(log10(value));
        digits = pow(10, decade + 1 - even->significant);
        even->low = pow(10, decade);
        even->high = 10 * even->low;
        even->fine = even->unit * (digits > decimals ? digits : decimals);
    }
    return even->unit * (digits > decimals ? digits : decimals);
}

void even_init(struct even *even, double first, double last, long long count, double unit,
               struct decimal_grain first_grain, struct decimal_grain last_grain)
{
    *even = (struct even){.first = first, .unit = unit};
    even->step = (last - first) / (double)(count - 1);
    even->rows = count;
    even->fraction = first_grain.fraction;
    note(even, first_grain);
    note(even, last_grain);
}

int even_next(struct even *even, double time, struct decimal_grain grain)
{
    note(even, grain);
    const double fine = resolution(even, time);
    const double before = even->last, coarse = fine > even->last_grain ? fine : even->last_grain;
    const long long row = even->count++;
    even->last = time;
    even->last_grain = fine;
    if (row > 0) {
        const double step = time - before;
        if (step < 0)
            return EVEN_BACKWARDS;
        if (fabs(step - even->step) > STEP_MOST * even->step + coarse)
            return EVEN_GAP;
        if (breaks_row(even, step))
            return EVEN_GAP;
    }
    const double grid = even->first + (double)row * even->step;
    if (even->drifted == 0 && fabs(time - grid) > GRID_MOST * even->step + 2 * coarse)
        even->drifted = row + 1;
    return EVEN_DONE;
}

int even_finish(const struct even *even)
{
    return even->drifted ? EVEN_DRIFT : EVEN_DONE;
}

double even_uncertainty(struct even *even)
{
    const double length = even->step * (double)(even->rows - 1);
    return resolution(even, even->first + length) / length;
}
