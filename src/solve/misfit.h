/* misfit.h - runs that do not fit one set of responses, in words. */
#ifndef LOPSIDE_SOLVE_MISFIT_H
#define LOPSIDE_SOLVE_MISFIT_H

#include <stdbool.h>
#include <stddef.h>

#include "solve/advice.h"
#include "solve/model.h"

/* The finding `linearity`: misfit of a row where runs are spare, about the run that does not fit
 * where it is known which. False: no figure, hence no finding. */
bool misfit_judge(const struct model *model, const struct model_row *row,
                  struct advice_finding *finding);

/* "'f', 't1' or 't2'": the runs of which any one may be wrong, two dozen bytes and more. False:
 * there is none such. */
bool misfit_list(const struct model *model, const struct model_row *row, char *text, size_t size);

#endif
