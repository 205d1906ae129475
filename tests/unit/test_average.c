/* Outlier blocks, trends, and the overall of a band. */
#include <setjmp.h>
#include <stdarg.h>
#include <stddef.h>
#include <stdint.h>

#include <cmocka.h>

#include "close_to.h"
#include "noise_source.h"

#include <math.h>

#include "average/blocks.h"
#include "average/overall.h"
#include "average/robust.h"
#include "average/trend.h"

#define PI_HERE 3.14159265358979323846

static void a_burst_is_set_aside(void **state)
{
    double complex z[30];
    bool keep[30];

    (void)state;
    seed = 1;
    for (int i = 0; i < 30; i++)
        z[i] = 50 + normal();
    assert_int_equal(robust_keep(z, 30, keep), 0);
    z[11] += 30;
    z[12] -= 30 * I;
    assert_int_equal(robust_keep(z, 30, keep), 2);
    assert_false(keep[11] || keep[12]);
    assert_true(keep[10] && keep[13]);
}

/* A machine that changed for good is not a burst: seven of thirty blocks (over a fifth) stay. */
static void a_step_is_kept(void **state)
{
    double complex z[30];
    bool keep[30];

    (void)state;
    seed = 2;
    for (int i = 0; i < 30; i++)
        z[i] = 50 + normal() + (i >= 23 ? 40 : 0);
    assert_int_equal(robust_keep(z, 30, keep), 0);
    for (int i = 0; i < 30; i++)
        assert_true(keep[i]);
}

/* Steady noise on one line, the worst case: the 99.9 % point is blurred by a median of only 20 distances,
 * yet under 1 % of the blocks go. */
static void steady_noise_is_kept(void **state)
{
    double complex z[20];
    bool keep[20];
    long aside = 0;

    (void)state;
    seed = 3;
    for (int k = 0; k < 2000; k++) {
        for (int i = 0; i < 20; i++)
            z[i] = 50 + creal(normal());
        aside += robust_keep(z, 20, keep);
    }
    assert_true(aside < 2000 * 20 / 100);
}

static void medians(void **state)
{
    double odd[] = {5, 1, 3}, even[] = {4, 1, 3, 2};

    (void)state;
    assert_close(robust_median(odd, 3), 3, 0);
    assert_close(robust_median(even, 4), 2.5, 0);
    assert_true(isnan(robust_median(odd, 0)));
}

/* Significant at 1 %: steady noise shows a trend about once in a hundred runs, a real one always.
 */
static void trends(void **state)
{
    double complex z[30];
    double t[30];
    int false_alarms = 0, found = 0;

    (void)state;
    seed = 4;
    for (int k = 0; k < 3000; k++) {
        for (int i = 0; i < 30; i++) {
            t[i] = 2 * i;
            z[i] = 50 + normal();
        }
        false_alarms += trend_size(z, t, 30) > 0;
        for (int i = 0; i < 30; i++)
            z[i] += 4 * I * t[i] / 58;
        found += trend_size(z, t, 30) > 0;
    }
    assert_in_range(false_alarms, 3, 60); /* 0.1 % to 2 % */
    assert_true(found > 2900);
}

static void trend_size_is_end_to_end(void **state)
{
    double complex z[11];
    double t[11];

    (void)state;
    for (int i = 0; i < 11; i++) {
        t[i] = 3 * i;
        z[i] = 5 + (0.03 + 0.04 * I) * t[i];
    }
    assert_close(trend_size(z, t, 11), 0.05 * 30, 1e-9);
    assert_true(isnan(trend_size(z, t, 3)));
    for (int i = 0; i < 11; i++)
        z[i] = 5;
    assert_close(trend_size(z, t, 11), 0, 0);
    z[4] = NAN;
    assert_true(isnan(trend_size(z, t, 11)));
}

/* A line of displacement d at f hertz is 2*pi*f*d of velocity and (2*pi*f)^2*d of acceleration, by
 * differentiation of a sine; rms is peak over root 2. 1500 rpm: order 1 is 25 Hz. */
static void overalls(void **state)
{
    static const double orders[] = {0.2, 1, 4, 41}, amplitude[] = {9, 2e-6, 1e-6, 9};
    double w = 2 * PI_HERE * 25, from, to;
    double velocity = hypot(w * 2e-6, 4 * w * 1e-6) / sqrt(2);

    (void)state;
    assert_close(overall_rms(orders, amplitude, 4, 1500, QUANTITY_DISPLACEMENT, QUANTITY_VELOCITY),
         velocity, 1e-12);
    assert_close(overall_rms(orders, amplitude, 4, 1500, QUANTITY_VELOCITY, QUANTITY_VELOCITY),
         hypot(2e-6, 1e-6) / sqrt(2), 1e-15);
    assert_close(overall_rms(orders, amplitude, 4, 1500, QUANTITY_ACCELERATION, QUANTITY_VELOCITY),
         hypot(2e-6 / w, 1e-6 / (4 * w)) / sqrt(2), 1e-18);
    assert_true(
        isnan(overall_rms(orders, amplitude, 0, 1500, QUANTITY_VELOCITY, QUANTITY_VELOCITY)));
    assert_true(
        isnan(overall_rms(orders, amplitude, 4, NAN, QUANTITY_VELOCITY, QUANTITY_VELOCITY)));
    overall_band(1500, &from, &to);
    assert_close(from, 10, 0);
    assert_close(to, 1000, 0);
    overall_band(600, &from, &to); /* 1x at 10 Hz: half of it is 5 Hz */
    assert_close(from, 5, 1e-12);
    assert_close(overall_one_x(orders, amplitude, 4), 2e-6, 0);
    assert_true(isnan(overall_one_x(orders + 2, amplitude + 2, 2)));
}

/* More blocks than fit become coarser: no turn is lost, means are weighted by turns, times ascend. */
static void many_blocks_are_packed(void **state)
{
    static const size_t counts[] = {1, BLOCKS_MOST - 1, BLOCKS_MOST, BLOCKS_MOST + 1, 3 * BLOCKS_MOST,
                                    10 * BLOCKS_MOST + 7};

    (void)state;
    for (size_t c = 0; c < sizeof counts / sizeof *counts; c++) {
        struct blocks b = {0};
        double complex sum = 0, mean = 0;
        double turns = 0, kept = 0;
        seed = 8;
        for (size_t i = 0; i < counts[c]; i++) {
            struct block one = {normal(), 20 + (double)(i % 3), (double)i, 1200};
            sum += one.vector * one.turns;
            turns += one.turns;
            assert_int_equal(blocks_add(&b, &one), 0);
        }
        blocks_end(&b);
        assert_true(b.count > 0 && b.count <= BLOCKS_MOST);
        assert_true(counts[c] > BLOCKS_MOST || b.count == counts[c]);
        for (size_t i = 0; i < b.count; i++) {
            mean += b.vectors[i] * b.turns[i];
            kept += b.turns[i];
            assert_close(b.speed[i], 1200, 1e-9);
            assert_true(i == 0 || b.t[i] > b.t[i - 1]);
        }
        /* at most less than half of a packed block, of 16, is dropped at the end */
        assert_true(turns - kept <= (counts[c] > BLOCKS_MOST ? 8 * 22 : 0));
        if (kept == turns)
            assert_true(cabs(mean - sum) < 1e-9 * turns);
        assert_false(blocks_empty(&b));
        blocks_clear(&b);
        assert_int_equal(b.count, 0);
        blocks_release(&b);
    }
}

/* A block without a vector counts for nothing beside one that has. */
static void empty_blocks_are_dropped(void **state)
{
    struct blocks b = {0};

    (void)state;
    for (size_t i = 0; i < 2 * BLOCKS_MOST; i++) {
        struct block one = {i % 2 ? CMPLX(1, 2) : CMPLX(NAN, NAN), 20, (double)i, 1200};
        assert_int_equal(blocks_add(&b, &one), 0);
    }
    blocks_end(&b);
    blocks_drop_empty(&b);
    assert_int_equal(b.count, BLOCKS_MOST);
    for (size_t i = 0; i < b.count; i++)
        assert_true(b.vectors[i] == CMPLX(1, 2));
    blocks_clear(&b);
    struct block none = {CMPLX(NAN, NAN), 20, 1, 1200};
    assert_int_equal(blocks_add(&b, &none), 0);
    blocks_drop_empty(&b);
    assert_true(b.count == 1 && blocks_empty(&b));
    blocks_release(&b);
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(many_blocks_are_packed),
        cmocka_unit_test(empty_blocks_are_dropped),
        cmocka_unit_test(a_burst_is_set_aside),
        cmocka_unit_test(a_step_is_kept),
        cmocka_unit_test(steady_noise_is_kept),
        cmocka_unit_test(medians),
        cmocka_unit_test(trends),
        cmocka_unit_test(trend_size_is_end_to_end),
        cmocka_unit_test(overalls),
    };
    return cmocka_run_group_tests(tests, NULL, NULL);
}
