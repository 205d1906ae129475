/* decimal.h - decimal text to the nearest double. */
#ifndef LOPSIDE_READ_DECIMAL_H
#define LOPSIDE_READ_DECIMAL_H

#include <stddef.h>

enum decimal_result {
    DECIMAL_DONE,
    DECIMAL_NOT_A_NUMBER, /* also for "nan" and "inf" in any spelling, and for an empty text */
    DECIMAL_OUT_OF_RANGE  /* larger than the largest double */
};

/* Reads the whole of text[0..length): sign, digits, at most one `point` ('.' or ','), exponent. No
 * blanks, no hexadecimal, no thousands separators; a digit is needed before the exponent. *value is
 * the double nearest to the text, as strtod gives in the C locale; it is set only for DECIMAL_DONE.
 *
 * Digits up to 2^53 times a power of ten up to 10^22 take one correctly rounded operation: W. D.
 * Clinger, "How to read floating point numbers accurately", PLDI 1990, 92-101. Others go to strtod.
 */
int decimal_parse(const char *text, size_t length, char point, double *value)
    __attribute__((warn_unused_result));

/* How finely a number was printed. */
struct decimal_grain {
    int fraction;    /* digits behind the point, less the exponent: 1.25e-3 has 5 */
    int significant; /* digits from the first one that is not zero; 0 for zero */
};

/* For text that decimal_parse takes. */
struct decimal_grain decimal_grain(const char *text, size_t length, char point);

/* Both at once; *grain, too, is set only for DECIMAL_DONE. */
int decimal_parse_grain(const char *text, size_t length, char point, double *value,
                        struct decimal_grain *grain) __attribute__((warn_unused_result));

#endif
