/* Sound files: exact values, and every way of being cut short. The files are written by libsndfile,
 * or byte by byte after the container's specification. */
#include <math.h>
#include <setjmp.h>
#include <stdarg.h>
#include <stddef.h>
#include <stdint.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <sys/stat.h>
#include <unistd.h>

#include <cmocka.h>
#include <sndfile.h>

#include "read/audio.h"
#include "read/columns.h"

#define FRAMES 5000
#define CHANNELS 3
#define SAMPLES (FRAMES * CHANNELS)

static const char path[] = "read_audio_test.bin";
static int codes[SAMPLES]; /* 32-bit, the top bits are what a shorter coding keeps */
static float back[SAMPLES];

static void make_codes(int bits)
{
    uint32_t state = 12345;
    for (int i = 0; i < SAMPLES; i++) {
        state = state * 1664525u + 1013904223u; /* Numerical Recipes' generator */
        codes[i] = (int)(state & ~((1u << (32 - bits)) - 1u));
    }
    codes[0] = INT32_MIN; /* the rails */
    codes[1] = (int)(0x7FFFFFFFu & ~((1u << (32 - bits)) - 1u));
}

static void write_sound(int format)
{
    SF_INFO info = {.samplerate = 12800, .channels = CHANNELS, .format = format};
    SNDFILE *file = sf_open(path, SFM_WRITE, &info);
    assert_non_null(file);
    assert_int_equal(sf_writef_int(file, codes, FRAMES), FRAMES);
    assert_int_equal(sf_close(file), 0);
}

/* Reads all of it in odd pieces. Status. */
static int read_sound(struct audio *audio, struct fault *fault)
{
    *fault = (struct fault){0};
    int status = audio_open(audio, path, fault);
    size_t got = 1, done = 0;
    while (status == STATUS_DONE && got > 0 && done <= FRAMES) {
        status = audio_read(audio, back + done * CHANNELS,
                            FRAMES - done < 617 ? FRAMES - done : 617, &got, fault);
        done += got;
        if (done == FRAMES)
            break;
    }
    audio_close(audio);
    return status;
}

static const struct {
    int format, bits;
} plain[] = {
    {SF_FORMAT_WAV | SF_FORMAT_PCM_16, 16},  {SF_FORMAT_WAV | SF_FORMAT_PCM_24, 24},
    {SF_FORMAT_WAV | SF_FORMAT_PCM_32, 32},  {SF_FORMAT_WAVEX | SF_FORMAT_PCM_24, 24},
    {SF_FORMAT_RF64 | SF_FORMAT_PCM_24, 24}, {SF_FORMAT_W64 | SF_FORMAT_PCM_24, 24},
    {SF_FORMAT_AIFF | SF_FORMAT_PCM_24, 24}, {SF_FORMAT_CAF | SF_FORMAT_PCM_24, 24},
    {SF_FORMAT_AU | SF_FORMAT_PCM_24, 24},   {SF_FORMAT_FLAC | SF_FORMAT_PCM_16, 16},
    {SF_FORMAT_FLAC | SF_FORMAT_PCM_24, 24},
};
#define PLAIN (sizeof plain / sizeof *plain)

/* A code of b bits is code/2^(b-1) of full scale, and float32 holds 24 bits exactly. */
static void test_exact_values(void **unused)
{
    (void)unused;
    for (size_t k = 0; k < PLAIN; k++) {
        struct audio audio;
        struct fault fault;
        make_codes(plain[k].bits);
        write_sound(plain[k].format);
        assert_int_equal(read_sound(&audio, &fault), STATUS_DONE);
        assert_int_equal(audio.channels, CHANNELS);
        assert_int_equal(audio.frames, FRAMES);
        assert_int_equal(audio.bits, plain[k].bits);
        assert_true(audio.rate_hz == 12800);
        assert_true(audio.largest == 1 - ldexp(1, 1 - plain[k].bits));
        assert_true(back[0] == -1.0f);
        assert_true(back[1] == (float)audio.largest);
        for (int i = 0; i < SAMPLES; i++)
            assert_true(back[i] == (float)ldexp(codes[i], -31));
    }
    unlink(path);
}

/* A file cut anywhere is refused, in its header as in its samples. */
static void test_cut_files(void **unused)
{
    (void)unused;
    for (size_t k = 0; k < PLAIN; k++) {
        make_codes(plain[k].bits);
        write_sound(plain[k].format);
        struct stat s;
        assert_int_equal(stat(path, &s), 0);
        const long size = (long)s.st_size;
        const long cuts[] = {size - 1, size - 100, size / 2, size / 3, 200, 60, 44, 20, 8, 3};
        for (size_t c = 0; c < sizeof cuts / sizeof *cuts; c++) {
            /* a pad byte or a trailing chunk of the container may be missing; samples may not */
            if (c == 0 && (plain[k].format & SF_FORMAT_TYPEMASK) == SF_FORMAT_AIFF)
                continue;
            struct audio audio;
            struct fault fault;
            write_sound(plain[k].format);
            assert_int_equal(truncate(path, cuts[c]), 0);
            if (read_sound(&audio, &fault) != STATUS_RECORDING)
                fail_msg("format %x cut from %ld to %ld bytes was read", plain[k].format, size,
                         cuts[c]);
            assert_true(strstr(fault.text, path) != NULL);
        }
    }
    unlink(path);
}

static void put32(unsigned char *p, uint32_t value)
{
    for (int i = 0; i < 4; i++)
        p[i] = (unsigned char)(value >> (8 * i));
}

/* A canonical 16-bit WAV of one channel (RIFF specification, 1991): `data` bytes, header says
 * `promised`. */
static void write_wav(uint32_t promised, size_t data)
{
    unsigned char head[44] = "RIFF....WAVEfmt ....\1\0\1\0";
    put32(head + 4, promised == 0xFFFFFFFFu ? promised : 36 + promised);
    put32(head + 16, 16);
    put32(head + 24, 8000);
    put32(head + 28, 16000);
    head[20] = head[22] = 1;
    head[21] = head[23] = 0;
    head[32] = 2;
    head[33] = 0;
    head[34] = 16;
    head[35] = 0;
    memcpy(head + 36, "data", 4);
    put32(head + 40, promised);
    FILE *file = fopen(path, "wb");
    assert_non_null(file);
    assert_int_equal(fwrite(head, 1, sizeof head, file), sizeof head);
    for (size_t i = 0; i < data; i++)
        fputc((int)(i & 63), file);
    assert_int_equal(fclose(file), 0);
}

static int open_wav(struct fault *fault)
{
    struct audio audio;
    *fault = (struct fault){0};
    const int status = audio_open(&audio, path, fault);
    audio_close(&audio);
    return status;
}

static void test_header_without_length(void **unused)
{
    (void)unused;
    struct fault fault;
    write_wav(1000, 1000);
    assert_int_equal(open_wav(&fault), STATUS_DONE); /* the header itself is right */
    write_wav(0, 1000);
    assert_int_equal(open_wav(&fault), STATUS_RECORDING);
    assert_non_null(strstr(fault.text, "no length"));
    write_wav(0xFFFFFFFFu, 1000);
    assert_int_equal(open_wav(&fault), STATUS_RECORDING);
    assert_non_null(strstr(fault.text, "no length"));
    write_wav(0, 0);
    assert_int_equal(open_wav(&fault), STATUS_RECORDING);
    write_wav(1002, 1000);
    assert_int_equal(open_wav(&fault), STATUS_RECORDING);
    assert_non_null(strstr(fault.text, "1002 bytes"));
    assert_non_null(strstr(fault.text, "1000 are there"));
    unlink(path);
}

static void write_floats(int format, const float *values, sf_count_t frames)
{
    SF_INFO info = {.samplerate = 8000, .channels = 2, .format = format};
    SNDFILE *file = sf_open(path, SFM_WRITE, &info);
    assert_non_null(file);
    assert_int_equal(sf_writef_float(file, values, frames), frames);
    assert_int_equal(sf_close(file), 0);
}

static void test_floats_and_nan(void **unused)
{
    (void)unused;
    const float values[8] = {0.5f, -2.5f, 1e-30f, 3e5f, 0, -0.0f, 7, 8};
    const float bad[] = {NAN, INFINITY, -INFINITY};
    for (int k = 0; k < 3; k++) {
        struct audio audio;
        struct fault fault = {0};
        float got_values[8], wrong[8];
        size_t got;
        write_floats(SF_FORMAT_WAV | SF_FORMAT_FLOAT, values, 4);
        assert_int_equal(audio_open(&audio, path, &fault), STATUS_DONE);
        assert_int_equal(audio_read(&audio, got_values, 4, &got, &fault), STATUS_DONE);
        assert_memory_equal(got_values, values, sizeof values);
        audio_close(&audio);
        memcpy(wrong, values, sizeof wrong);
        wrong[5] = bad[k];
        write_floats(SF_FORMAT_WAV | (k ? SF_FORMAT_DOUBLE : SF_FORMAT_FLOAT), wrong, 4);
        assert_int_equal(audio_open(&audio, path, &fault), STATUS_DONE);
        assert_int_equal(audio_read(&audio, got_values, 4, &got, &fault), STATUS_RECORDING);
        assert_non_null(strstr(fault.text, "frame 2, channel 2"));
        audio_close(&audio);
    }
    unlink(path);
}

static void test_codings_that_lose(void **unused)
{
    (void)unused;
    struct audio audio;
    struct fault fault;
    make_codes(16);
    write_sound(SF_FORMAT_WAV | SF_FORMAT_ULAW);
    assert_int_equal(read_sound(&audio, &fault), STATUS_RECORDING);
    assert_non_null(strstr(fault.text, "loses"));
    unlink(path);
}

/* Both ways through columns_move give the plain product. */
static void test_columns(void **unused)
{
    (void)unused;
    enum { FRAMES_MOVED = 101 };
    for (size_t width = 1; width <= 9; width++) {
        struct columns_route routes[9], turned[9];
        float in[9 * FRAMES_MOVED], out[9 * FRAMES_MOVED];
        for (size_t i = 0; i < width; i++) {
            routes[i] = (struct columns_route){i, i, 0.25f * (float)(i + 1)};
            turned[i] = (struct columns_route){i, width - 1 - i, 3.0f};
        }
        for (size_t i = 0; i < width * FRAMES_MOVED; i++)
            in[i] = (float)i;
        columns_move(in, width, out, width, routes, width, FRAMES_MOVED);
        for (size_t i = 0; i < width * FRAMES_MOVED; i++)
            assert_true(out[i] == (float)i * 0.25f * (float)(i % width + 1));
        columns_move(in, width, out, width, turned, width, FRAMES_MOVED);
        for (size_t f = 0; f < FRAMES_MOVED; f++)
            for (size_t i = 0; i < width; i++)
                assert_true(out[f * width + width - 1 - i] == 3.0f * in[f * width + i]);
    }
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(test_exact_values),          cmocka_unit_test(test_cut_files),
        cmocka_unit_test(test_header_without_length), cmocka_unit_test(test_floats_and_nan),
        cmocka_unit_test(test_codings_that_lose),     cmocka_unit_test(test_columns),
    };
    return cmocka_run_group_tests(tests, NULL, NULL);
}
