#include "read/decimal.h"

#include <locale.h>
#include <math.h>
#include <stdbool.h>
#include <stdint.h>
#include <stdlib.h>
#include <string.h>

#define DIGITS_MOST 19          /* 10^19 - 1 fits 64 bits */
#define EXACT_MOST (1ULL << 53) /* every integer up to here is a double */
#define POWER_MOST 22           /* 10^22 is the largest power of ten that is a double */
#define TEXT_MOST 512           /* longer numbers are no measurement */

struct parts {
    uint64_t digits;      /* the first DIGITS_MOST significant digits */
    int exponent;         /* of ten, for `digits` */
    bool negative, whole; /* whole: no digit was left out */
};

static inline bool is_digit(char c)
{
    return (unsigned char)(c - '0') < 10;
}

/* [eE][+-]digits up to the end. Values beyond any double are held at +-100000. */
static bool read_exponent(const char *p, const char *end, int *exponent)
{
    bool negative = false;
    if (p < end && (*p == '+' || *p == '-'))
        negative = *p++ == '-';
    if (p == end)
        return false;
    int value = 0;
    for (; p < end; p++) {
        if (!is_digit(*p))
            return false;
        if (value < 100000)
            value = value * 10 + (*p - '0');
    }
    *exponent += negative ? -value : value;
    return true;
}

static bool take_apart(const char *p, const char *end, char point, struct parts *parts)
{
    uint64_t digits = 0;
    int kept = 0, exponent = 0;
    bool any = false, whole = true, negative = false;
    if (p < end && (*p == '-' || *p == '+'))
        negative = *p++ == '-';
    bool behind = false;
    for (; p < end; p++) {
        if (is_digit(*p)) {
            any = true;
            if (kept < DIGITS_MOST) {
                digits = digits * 10 + (uint64_t)(*p - '0');
                kept += digits != 0;
                exponent -= behind;
            } else {
                whole = whole && *p == '0';
                exponent += !behind;
            }
        } else if (*p == point && !behind) {
            behind = true;
        } else {
            break;
        }
    }
    if (!any)
        return false;
    if (p < end && ((*p != 'e' && *p != 'E') || !read_exponent(p + 1, end, &exponent)))
        return false;
    *parts = (struct parts){digits, exponent, negative, whole};
    return true;
}

static int slow(const char *text, size_t length, char point, double *value)
{
    char copy[TEXT_MOST];
    if (length >= sizeof copy)
        return DECIMAL_NOT_A_NUMBER;
    memcpy(copy, text, length);
    copy[length] = '\0';
    char *comma = point == '.' ? NULL : strchr(copy, point);
    if (comma)
        *comma = '.';
    locale_t plain = newlocale(LC_ALL_MASK, "C", (locale_t)0); /* shared and static in every libc */
    if (!plain)
        return DECIMAL_NOT_A_NUMBER;
    locale_t before = uselocale(plain);
    double x = strtod(copy, NULL);
    uselocale(before);
    freelocale(plain);
    if (!isfinite(x))
        return DECIMAL_OUT_OF_RANGE;
    *value = x;
    return DECIMAL_DONE;
}

static const double powers[POWER_MOST + 1] = {1e0,  1e1,  1e2,  1e3,  1e4,  1e5,  1e6,  1e7,
                                              1e8,  1e9,  1e10, 1e11, 1e12, 1e13, 1e14, 1e15,
                                              1e16, 1e17, 1e18, 1e19, 1e20, 1e21, 1e22};

/* Digits from p on, appended to *digits; two at a time, which halves the chain of multiplications.
 */
static inline const char *take_digits(const char *p, const char *end, uint64_t *digits)
{
    unsigned first, second;
    while (end - p >= 2 && (first = (unsigned char)(p[0] - '0')) < 10 &&
           (second = (unsigned char)(p[1] - '0')) < 10) {
        *digits = *digits * 100 + (first * 10 + second);
        p += 2;
    }
    if (p < end && (first = (unsigned char)(*p - '0')) < 10) {
        *digits = *digits * 10 + first;
        p++;
    }
    return p;
}

struct plain { /* what nearly every cell is: at most 19 characters, a sign, digits and a point */
    uint64_t digits;
    ptrdiff_t behind; /* digits behind the point */
    double value;
};

/* False: not that. */
static inline bool is_plain(const char *text, size_t length, char point, struct plain *plain)
{
    const char *p = text, *end = text + length;
    if (length > DIGITS_MOST || length == 0)
        return false;
    const bool negative = *p == '-';
    p += negative;
    uint64_t digits = 0;
    const char *first = p;
    p = take_digits(p, end, &digits);
    ptrdiff_t count = p - first, behind = 0;
    if (p < end && *p == point) {
        first = ++p;
        p = take_digits(p, end, &digits);
        behind = p - first;
        count += behind;
    }
    if (p < end || count == 0 || digits > EXACT_MOST)
        return false;
    const double x = (double)(int64_t)digits / powers[behind];
    *plain = (struct plain){digits, behind, negative ? -x : x};
    return true;
}

/* What is_plain does not take. */
static int parse_any(const char *text, size_t length, char point, double *value)
{
    struct parts parts;
    if (!take_apart(text, text + length, point, &parts))
        return DECIMAL_NOT_A_NUMBER;
    if (!parts.whole || parts.digits > EXACT_MOST || parts.exponent > POWER_MOST ||
        parts.exponent < -POWER_MOST)
        return slow(text, length, point, value);
    double x = (double)parts.digits;
    x = parts.exponent < 0 ? x / powers[-parts.exponent] : x * powers[parts.exponent];
    *value = parts.negative ? -x : x;
    return DECIMAL_DONE;
}

int decimal_parse(const char *text, size_t length, char point, double *value)
{
    struct plain plain;
    if (!is_plain(text, length, point, &plain))
        return parse_any(text, length, point, value);
    *value = plain.value;
    return DECIMAL_DONE;
}

int decimal_parse_grain(const char *text, size_t length, char point, double *value,
                        struct decimal_grain *grain)
{
    struct plain plain;
    if (!is_plain(text, length, point, &plain)) {
        const int result = parse_any(text, length, point, value);
        if (result == DECIMAL_DONE)
            *grain = decimal_grain(text, length, point);
        return result;
    }
    *value = plain.value;
    *grain = (struct decimal_grain){(int)plain.behind, 0};
    while ((double)(int64_t)plain.digits >= powers[grain->significant]) /* 2^53 has 16 digits */
        grain->significant++;
    return DECIMAL_DONE;
}

struct decimal_grain decimal_grain(const char *text, size_t length, char point)
{
    struct decimal_grain grain = {0, 0};
    bool behind = false;
    size_t i = 0;
    for (; i < length && text[i] != 'e' && text[i] != 'E'; i++) {
        if (text[i] == point) {
            behind = true;
        } else if (is_digit(text[i])) {
            grain.fraction += behind;
            grain.significant += grain.significant > 0 || text[i] != '0';
        }
    }
    int exponent = 0;
    if (i < length && read_exponent(text + i + 1, text + length, &exponent))
        grain.fraction -= exponent;
    return grain;
}
