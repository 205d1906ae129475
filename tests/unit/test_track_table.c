/* The acceptance table of tracking, 200 simulated recordings a row; the bars stand in
 * track_campaign.h. */
#include "track_campaign.h"

#ifdef __SANITIZE_ADDRESS__ /* several times slower; the figures are judged without it */
#define RECORDINGS 30
#else
#define RECORDINGS 200
#endif

static void test_row(void **state)
{
    const struct campaign_row *row = *state;
    struct campaign_result result = campaign_run(row, RECORDINGS);

    campaign_print(row, &result);
    assert_int_equal(result.without, 0);
    assert_true(result.bias_percent <= CAMPAIGN_BIAS_PERCENT);
    assert_true(result.bias_deg <= CAMPAIGN_BIAS_DEG);
    if (RECORDINGS < 200) {
        return;
    }
    assert_true(result.efficiency >= CAMPAIGN_EFFICIENCY);
    assert_true(result.efficiency <= 1.3); /* far better than the bound: a wrong test */
    assert_true(result.inside >= CAMPAIGN_INSIDE_LEAST && result.inside <= CAMPAIGN_INSIDE_MOST);
}

int main(void)
{
    struct CMUnitTest tests[CAMPAIGN_ROWS];

    for (size_t i = 0; i < CAMPAIGN_ROWS; i++) {
        tests[i] = (struct CMUnitTest){.name = campaign_rows[i].name,
                                       .test_func = test_row,
                                       .initial_state = (void *)&campaign_rows[i]};
    }
    return cmocka_run_group_tests(tests, NULL, NULL);
}
