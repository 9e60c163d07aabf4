// SPDX-License-Identifier: GPL-3.0-or-later
// The peer in plain C: one planned FFTW transform per take, then the figures by hand. No
// uncertainties, no floor, no settling, no checks.
//   peer plan DIR WORKLOAD WISDOM        measures the plan and stores it
//   peer time DIR WORKLOAD TIMES [WISDOM]  prints seconds for all takes; without WISDOM estimated
#define _GNU_SOURCE
#include <complex.h>  // before fftw3.h: fftw_complex is then C's own

#include <fftw3.h>
#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <time.h>

#include "takes.h"

enum { ORDERS = 10, PRODUCT_ORDER = 5, WINDOW = 16384 };
static const double kLow = 20.0, kHigh = 20000.0, kReach = 0.45;

typedef struct {
  TakesHeader h;
  double* samples;
} Takes;

// What a take is read into; summed up so that no compiler can leave the work out.
typedef struct {
  double complex line[64];
  int lines;
  double thd, thdn;
} Figures;

// Time of the processor spent here: other programs on the machine do not count.
static double now(void) {
  struct timespec t;
  clock_gettime(CLOCK_PROCESS_CPUTIME_ID, &t);
  return (double)t.tv_sec + 1e-9 * (double)t.tv_nsec;
}

static void fail(const char* what) {
  fprintf(stderr, "peer: %s\n", what);
  exit(1);
}

static Takes load(const char* folder, const char* workload) {
  char name[4096];
  Takes t;
  snprintf(name, sizeof name, "%s/%s.takes", folder, workload);
  FILE* file = fopen(name, "rb");
  if (!file || fread(&t.h, sizeof t.h, 1, file) != 1) fail("no takes; run `bench make` first");
  const size_t count = (size_t)(t.h.takes * t.h.frames);
  t.samples = malloc(count * sizeof(double));
  if (fseek(file, (long)((size_t)t.h.takes * sizeof(double)), SEEK_CUR) != 0) fail("cut short");
  if (fread(t.samples, sizeof(double), count, file) != count) fail("cut short");
  fclose(file);
  return t;
}

static double power(fftw_complex z) { return creal(z) * creal(z) + cimag(z) * cimag(z); }

// Harmonics 1 .. 10 as phasors against the fundamental's phase, THD_F, THD+N from 20 Hz to 20 kHz.
static void read_steady(const TakesHeader* h, fftw_complex* spectrum, Figures* f) {
  const long c = (long)h->cycles1;
  const double width = (double)h->rate / (double)h->hold, scale = 2.0 / (double)h->hold;
  const double turn = carg(spectrum[c]);
  double harmonics = 0.0;
  f->lines = 0;
  for (int n = 1; n <= ORDERS && n * c < kReach * (double)h->hold; ++n) {
    f->line[f->lines++] = scale * spectrum[n * c] * cexp(-I * n * turn);
    if (n > 1 && n * (double)c * width < kHigh) harmonics += power(spectrum[n * c]);
  }
  f->thd = sqrt(harmonics / power(spectrum[c]));
  const long low = (long)ceil(kLow / width), high = (long)floor(kHigh / width);
  double rest = 0.0;
  for (long k = low; k < c; ++k) rest += power(spectrum[k]);
  for (long k = c + 1; k <= high; ++k) rest += power(spectrum[k]);
  f->thdn = sqrt(rest / (rest + power(spectrum[c])));
}

// Every product k1 f1 + k2 f2 up to order 5 that the rate can show, as phasors against both tones.
static void read_two_tone(const TakesHeader* h, fftw_complex* spectrum, Figures* f) {
  const long c1 = (long)h->cycles1, c2 = (long)h->cycles2;
  const double scale = 2.0 / (double)h->hold;
  const double turn1 = carg(spectrum[c1]), turn2 = carg(spectrum[c2]);
  f->lines = 0;
  for (int k1 = -PRODUCT_ORDER; k1 <= PRODUCT_ORDER; ++k1) {
    for (int k2 = -PRODUCT_ORDER; k2 <= PRODUCT_ORDER; ++k2) {
      const long bin = k1 * c1 + k2 * c2;
      if (abs(k1) + abs(k2) > PRODUCT_ORDER || bin <= 0) continue;
      if ((double)bin > kReach * (double)h->hold) continue;
      f->line[f->lines++] = scale * spectrum[bin] * cexp(-I * (k1 * turn1 + k2 * turn2));
    }
  }
  const double u1 = cabs(spectrum[c1]), u2 = cabs(spectrum[c2]);
  const double side = cabs(spectrum[c2 - c1]);
  if (c2 > 2 * c1) {  // modulation distortion, else difference-frequency distortion
    const double second = side + cabs(spectrum[c2 + c1]);
    const double third = cabs(spectrum[c2 - 2 * c1]) + cabs(spectrum[c2 + 2 * c1]);
    f->thd = hypot(second, third) / u2;
  } else {
    const double third = cabs(spectrum[2 * c1 - c2]) + cabs(spectrum[2 * c2 - c1]);
    f->thd = hypot(side, third) / (u1 + u2);
  }
}

// One plan per length, in and out of arrays of its own.
typedef struct {
  int size;
  double* in;
  fftw_complex* out;
  fftw_plan forward, back;
} Transform;

static Transform transform(int size, int both, unsigned flags) {
  Transform t = {size, fftw_alloc_real((size_t)size), fftw_alloc_complex((size_t)(size / 2 + 1)),
                 NULL, NULL};
  t.forward = fftw_plan_dft_r2c_1d(size, t.in, t.out, flags);
  if (both) t.back = fftw_plan_dft_c2r_1d(size, t.out, t.in, flags);
  if (!t.forward || (both && !t.back)) fail("the wisdom is for another length");
  return t;
}

// One over the spectrum of the synchronised sweep (stationary phase: Novak, Lotton & Simon 2015).
static fftw_complex* inverse_of(const TakesHeader* h, int size) {
  fftw_complex* inverse = fftw_alloc_complex((size_t)(size / 2 + 1));
  for (int k = 0; k <= size / 2; ++k) {
    const double f = (double)k * (double)h->rate / size;
    const double s = 2.0 * M_PI * f * h->growth;
    inverse[k] = f < 0.5 * h->start ? 0.0
                                    : 2.0 / (double)h->rate * sqrt(f / h->growth) *
                                          cexp(-I * (s * (1.0 - log(f / h->start)) + M_PI / 4.0));
  }
  return inverse;
}

// The mean of the repeats through the inverse, then a window about the instant of each order.
static double read_sweep(const TakesHeader* h, const double* take, const Transform* whole,
                         const Transform* part, const fftw_complex* inverse, const double* window,
                         long* figures) {
  double sum = 0.0;
  for (int i = 0; i < whole->size; ++i) {
    double x = 0.0;
    for (long b = 0; b < h->blocks; ++b) x += take[b * whole->size + i];
    whole->in[i] = x / (double)h->blocks;
  }
  fftw_execute(whole->forward);
  for (int k = 0; k <= whole->size / 2; ++k) {
    const double complex a = whole->out[k], b = inverse[k];
    whole->out[k] =
        creal(a) * creal(b) - cimag(a) * cimag(b) + I * (creal(a) * cimag(b) + cimag(a) * creal(b));
  }
  fftw_execute(whole->back);
  for (int n = 1; n <= ORDERS; ++n) {
    const long instant = lround(-h->growth * log(n) * (double)h->rate) - WINDOW / 2;
    for (long i = 0; i < WINDOW; ++i) {
      const long at = ((instant + i) % whole->size + whole->size) % whole->size;
      part->in[i] = whole->in[at] / whole->size * window[i];
    }
    fftw_execute(part->forward);
    for (int k = 0; k <= WINDOW / 2; ++k) sum += sqrt(power(part->out[k]));
    *figures += WINDOW / 2 + 1;
  }
  return sum;
}

int main(int argc, char** argv) {
  const int plans = argc == 5 && strcmp(argv[1], "plan") == 0;
  const int times = (argc == 5 || argc == 6) && strcmp(argv[1], "time") == 0 ? atoi(argv[4]) : 0;
  if (!plans && times < 1) fail("plan DIR WORKLOAD WISDOM | time DIR WORKLOAD TIMES [WISDOM]");
  const Takes t = load(argv[2], argv[3]);
  const int sweep = t.h.start > 0.0;
  const int size = (int)(sweep ? t.h.hold / t.h.blocks : t.h.hold);
  if (plans) {
    transform(size, sweep, FFTW_MEASURE);
    if (sweep) transform(WINDOW, 0, FFTW_MEASURE);
    return fftw_export_wisdom_to_filename(argv[4]) ? 0 : 1;
  }
  const unsigned flags = argc == 6 ? FFTW_MEASURE | FFTW_WISDOM_ONLY : FFTW_ESTIMATE;
  if (argc == 6 && !fftw_import_wisdom_from_filename(argv[5])) fail("no wisdom there");
  double window[WINDOW];
  for (int i = 0; i < WINDOW; ++i) window[i] = 0.5 - 0.5 * cos(2.0 * M_PI * i / (WINDOW - 1));

  Transform whole = {0}, part = {0};
  fftw_complex* inverse = NULL;
  double sum = 0.0;
  long figures = 0;
  for (int r = 0; r <= times; ++r) {
    const double begin = now();
    if (r == 0) {
      whole = transform(size, sweep, flags);
      if (sweep) {
        part = transform(WINDOW, 0, flags);
        inverse = inverse_of(&t.h, size);
      }
    }
    figures = 0;
    for (long k = 0; k < t.h.takes; ++k) {
      const double* take = t.samples + k * t.h.frames + t.h.first;
      if (sweep) {
        sum += read_sweep(&t.h, take, &whole, &part, inverse, window, &figures);
        continue;
      }
      Figures f;
      memcpy(whole.in, take, sizeof(double) * (size_t)size);
      fftw_execute(whole.forward);
      if (t.h.cycles2 == 0) {
        read_steady(&t.h, whole.out, &f);
      } else {
        read_two_tone(&t.h, whole.out, &f);
      }
      sum += f.thd + cabs(f.line[f.lines - 1]);
      figures += f.lines;
    }
    printf("%s %.9f\n", r == 0 ? "first" : "warm", now() - begin);
  }
  printf("figures %ld\n", figures);
  fprintf(stderr, "%s", sum == sum ? "" : "not a number\n");
  return 0;
}
