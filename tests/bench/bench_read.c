/* bench_read.c - the whole chain against the least that anybody must do with the same files:
 * cutting the text into cells (libcsv) or decoding the sound (libsndfile), and hashing (libcrypto),
 * one after another in one thread.
 *
 *     bench_read PROGRAM [PAIRS [FOLDER]]
 *
 * PROGRAM is the built `lopside`. Makes two invented jobs of two runs in FOLDER (a new one under
 * TMPDIR, removed at the end, where none is given): 74 MB of text with a time column, and 61
 * million samples of 24-bit WAV. Then times `balance` and the reference in turn, and prints the
 * ratios pair by pair as median, least and most. */
#include <csv.h>
#include <errno.h>
#include <fcntl.h>
#include <math.h>
#include <openssl/evp.h>
#include <sndfile.h>
#include <stdbool.h>
#include <stdint.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <sys/stat.h>
#include <sys/wait.h>
#include <time.h>
#include <unistd.h>

#define RATE 12800
#define TURN 512  /* samples */
#define COLUMNS 4 /* three sensors and the tacho */
#define PAIRS_MOST 1000
#define PIECE 65536u      /* bytes at a time of the reference */
#define TEXT_ROWS 880000L /* a run: 37 MB */
#define SOUND_FRAMES 7625000L
#define PART 4096 /* frames written at a time */

static const char *const runs[] = {"as-found", "trial"};

/* One frame, V. Noise by xorshift64 (Marsaglia, J. Stat. Softw. 8 (2003) 14); nothing rests on it.
 */
static void make_frame(long i, int run, double x[COLUMNS])
{
    static uint64_t state = 88172645463325252ULL;
    const double theta = 2 * 3.14159265358979323846 * (double)(i % TURN) / TURN;
    for (int c = 0; c + 1 < COLUMNS; c++) {
        state ^= state << 13;
        state ^= state >> 7;
        state ^= state << 17;
        x[c] = (run ? 0.6 : 1.0) * cos(theta - 1 - c - 0.4 * run) +
               0.2 * ((double)(state >> 11) / 9007199254740992.0 - 0.5);
    }
    x[COLUMNS - 1] = i % TURN > 16 && i % TURN < 40 ? 5.0 : 0.0;
}

static int write_text(const char *path, int run)
{
    FILE *file = fopen(path, "w");
    if (!file)
        return -1;
    fputs("Time,DE-V,DE-H,NDE-H,Tacho\ns,m/s2,m/s2,m/s2,V\n", file);
    for (long i = 0; i < TEXT_ROWS; i++) {
        double x[COLUMNS];
        make_frame(i, run, x);
        fprintf(file, "%.6f,%.6f,%.6f,%.6f,%.3f\n", (double)i / RATE, x[0], x[1], x[2], x[3]);
    }
    const bool failed = ferror(file) != 0;
    return fclose(file) != 0 || failed ? -1 : 0;
}

static int write_sound(const char *path, int run)
{
    SF_INFO info = {
        .samplerate = RATE, .channels = COLUMNS, .format = SF_FORMAT_WAV | SF_FORMAT_PCM_24};
    SNDFILE *file = sf_open(path, SFM_WRITE, &info);
    static float part[PART * COLUMNS];
    long done = 0;
    while (file && done < SOUND_FRAMES) {
        const long count = SOUND_FRAMES - done < PART ? SOUND_FRAMES - done : PART;
        for (long i = 0; i < count; i++) {
            double x[COLUMNS];
            make_frame(done + i, run, x);
            for (int c = 0; c < COLUMNS; c++)
                part[i * COLUMNS + c] = (float)(x[c] / 10);
        }
        if (sf_writef_float(file, part, count) != count)
            break;
        done += count;
    }
    return file && sf_close(file) == 0 && done == SOUND_FRAMES ? 0 : -1;
}

static int write_sheet(const char *path, bool text)
{
    FILE *file = fopen(path, "w");
    if (!file)
        return -1;
    fprintf(file,
            "[job]\ntitle = Bench\nangles = against rotation\n"
            "[rotor]\nmass = 4000 kg\nservice speed = 1500 rpm\n%s"
            "[tacho]\nchannel = %s\n",
            text ? "" : "[recording]\nfull scale = 10 V\n", text ? "Tacho" : "4");
    static const char *const sensors[] = {"DE-V", "DE-H", "NDE-H"};
    for (int c = 0; c < 3; c++) {
        fprintf(file, "[sensor %s]\nunit = m/s2\nshow = mm/s rms\n", sensors[c]);
        if (text)
            fprintf(file, "channel = %s\n", sensors[c]);
        else
            fprintf(file, "channel = %d\nscale = 1 V/(m/s2)\n", c + 1);
    }
    fprintf(file,
            "[plane wheel]\nradius = 500 mm\npositions = 12 from 0 deg\nstock = 10 20 50 g\n"
            "[run as-found]\nfile = as-found.%s\n"
            "[run trial]\nfile = trial.%s\nweight wheel = 60 g at position 2\n",
            text ? "csv" : "wav", text ? "csv" : "wav");
    const bool failed = ferror(file) != 0;
    return fclose(file) != 0 || failed ? -1 : 0;
}

struct bench {
    bool text;
    char sheet[512], files[2][512];
};

static int make_job(struct bench *bench, const char *folder, bool text)
{
    bench->text = text;
    snprintf(bench->sheet, sizeof bench->sheet, "%s/%s.ini", folder, text ? "text" : "sound");
    if (write_sheet(bench->sheet, text) != 0)
        return -1;
    for (int run = 0; run < 2; run++) {
        char *path = bench->files[run];
        snprintf(path, sizeof bench->files[run], "%s/%s.%s", folder, runs[run],
                 text ? "csv" : "wav");
        if (access(path, R_OK) == 0) /* of an earlier time, in a folder that was given */
            continue;
        if ((text ? write_text(path, run) : write_sound(path, run)) != 0)
            return -1;
    }
    return 0;
}

/* ---- the reference ---- */

static void count_cell(void *cell, size_t length, void *data)
{
    (void)cell;
    (void)length;
    ++*(long *)data;
}

static void count_row(int mark, void *data)
{
    (void)mark;
    ++*(long *)data;
}

static int hash_and_cut(const char *path, EVP_MD_CTX *hash, struct csv_parser *parser)
{
    static char piece[PIECE];
    long count = 0;
    ssize_t got = -1;
    const int fd = open(path, O_RDONLY);
    while (fd >= 0 && (got = read(fd, piece, sizeof piece)) > 0) {
        if (!EVP_DigestUpdate(hash, piece, (size_t)got))
            return -1;
        if (parser &&
            csv_parse(parser, piece, (size_t)got, count_cell, count_row, &count) != (size_t)got)
            return -1;
    }
    close(fd);
    return got == 0 && (!parser || csv_fini(parser, count_cell, count_row, &count) == 0) ? 0 : -1;
}

static int decode(const char *path)
{
    static float part[PART * COLUMNS];
    SF_INFO info = {0};
    SNDFILE *file = sf_open(path, SFM_READ, &info);
    sf_count_t done = 0, got = 0;
    while (file && (got = sf_readf_float(file, part, PART)) > 0)
        done += got;
    return file && done == info.frames && sf_close(file) == 0 ? 0 : -1;
}

static int reference(const struct bench *bench)
{
    for (int run = 0; run < 2; run++) {
        unsigned char sum[EVP_MAX_MD_SIZE];
        unsigned size;
        struct csv_parser parser;
        EVP_MD_CTX *hash = EVP_MD_CTX_new();
        if (!hash || !EVP_DigestInit_ex(hash, EVP_sha256(), NULL) || csv_init(&parser, 0) != 0)
            return -1;
        if (hash_and_cut(bench->files[run], hash, bench->text ? &parser : NULL) != 0 ||
            (!bench->text && decode(bench->files[run]) != 0) ||
            !EVP_DigestFinal_ex(hash, sum, &size))
            return -1;
        csv_free(&parser);
        EVP_MD_CTX_free(hash);
    }
    return 0;
}

/* ---- the clock ---- */

static double now(void)
{
    struct timespec t;
    clock_gettime(CLOCK_MONOTONIC, &t);
    return (double)t.tv_sec + 1e-9 * (double)t.tv_nsec;
}

/* Seconds that a process of its own takes, the reference where no program is given; -1: it failed.
 */
static double time_of(const struct bench *bench, const char *program)
{
    const double from = now();
    const pid_t child = fork();
    if (child == 0) {
        if (!program)
            _exit(reference(bench) == 0 ? 0 : 1);
        const int nowhere = open("/dev/null", O_WRONLY);
        dup2(nowhere, STDOUT_FILENO);
        execl(program, program, "balance", bench->sheet, (char *)NULL);
        _exit(127);
    }
    int status = -1;
    while (child > 0 && waitpid(child, &status, 0) < 0 && errno == EINTR)
        ;
    return child > 0 && status == 0 ? now() - from : -1;
}

static int by_size(const void *a, const void *b)
{
    const double x = *(const double *)a, y = *(const double *)b;
    return (x > y) - (x < y);
}

static int time_pairs(const struct bench *bench, const char *program, int pairs)
{
    double chain[PAIRS_MOST], least[PAIRS_MOST], ratio[PAIRS_MOST];
    for (int i = -1; i < pairs; i++) { /* the first is to warm up */
        const double a = time_of(bench, program), b = time_of(bench, NULL);
        if (!(a > 0 && b > 0)) {
            fprintf(stderr, "bench_read: '%s balance %s' or the reference failed\n", program,
                    bench->sheet);
            return -1;
        }
        const int at = i < 0 ? 0 : i;
        chain[at] = a;
        least[at] = b;
        ratio[at] = a / b;
    }
    qsort(chain, (size_t)pairs, sizeof *chain, by_size);
    qsort(least, (size_t)pairs, sizeof *least, by_size);
    qsort(ratio, (size_t)pairs, sizeof *ratio, by_size);
    const int middle = pairs / 2;
    printf(
        "%s: chain %.3f s, %s and hashing %.3f s (medians); ratio %.2f (%.2f to %.2f, %d pairs)\n",
        bench->text ? "text" : "sound", chain[middle], bench->text ? "cutting" : "decoding",
        least[middle], ratio[middle], ratio[0], ratio[pairs - 1], pairs);
    return 0;
}

int main(int argc, char **argv)
{
    const int pairs = argc > 2 ? atoi(argv[2]) : 11;
    char made[512];
    const char *parent = getenv("TMPDIR");
    snprintf(made, sizeof made, "%s/bench-read-XXXXXX", parent ? parent : "/tmp");
    if (argc < 2 || pairs < 1 || pairs > PAIRS_MOST) {
        fprintf(stderr, "usage: bench_read PROGRAM [PAIRS [FOLDER]]\n");
        return 2;
    }
    const char *folder = argc > 3 ? argv[3] : mkdtemp(made);
    int status = folder ? 0 : 1;
    for (int text = 1; text >= 0 && status == 0; text--) {
        struct bench bench;
        status = make_job(&bench, folder, text) != 0 || time_pairs(&bench, argv[1], pairs) != 0;
        for (int run = 0; run < 2 && argc <= 3; run++)
            unlink(bench.files[run]);
        if (argc <= 3)
            unlink(bench.sheet);
    }
    if (folder && argc <= 3)
        rmdir(folder);
    return status;
}
