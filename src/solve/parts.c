#include "solve/parts.h"

void parts_split(const double complex w[2], const double radius[2], double complex *static_part,
                 double complex *couple_part)
{
    double complex first = w[0] * radius[0], second = w[1] * radius[1];
    *static_part = (first + second) / 2;
    *couple_part = (first - second) / 2;
}

void parts_reduce(const double complex *forms, size_t rows, const double radius[2],
                  double complex *out)
{
    double map[3][2] = {{1, 0}, {0, 1 / radius[0]}, {0, 1 / radius[1]}};
    for (size_t r = 0; r < rows; r++)
        for (size_t a = 0; a < 2; a++)
            for (size_t b = 0; b < 2; b++) {
                double complex sum = 0;
                for (size_t i = 0; i < 3; i++)
                    for (size_t j = 0; j < 3; j++)
                        sum += map[i][a] * forms[(r * 3 + i) * 3 + j] * map[j][b];
                out[(r * 2 + a) * 2 + b] = sum;
            }
}
