/* The yardstick of rate.bench.ts: one straight pass over the same cells with a tabulated mean inverse speed.
 * Reads from standard input: rows, columns, momentum edges (eV), energy edges (eV), values, mass (eV), largest speed (km/s),
 * n, n + 1 samples of the mean inverse speed, repetitions. Prints the shortest time of a pass, ms, and a checksum. */
#include <stdio.h>
#include <stdlib.h>
#include <time.h>

static double *read_doubles(long n) {
  double *x = malloc(n * sizeof *x);
  if (fread(x, sizeof *x, n, stdin) != (size_t)n) exit(1);
  return x;
}

int main(void) {
  double *size = read_doubles(2);
  long rows = (long)size[0], columns = (long)size[1];
  double *q_edge = read_doubles(rows + 1), *e_edge = read_doubles(columns + 1), *value = read_doubles(rows * columns);
  double *head = read_doubles(4);
  double mass = head[0], v_max = head[1];
  long n = (long)head[2], repetitions = (long)head[3];
  double *eta = read_doubles(n + 1);
  double best = 1e9, sum = 0;
  for (long r = 0; r < repetitions; r++) {
    struct timespec a, b;
    clock_gettime(CLOCK_MONOTONIC, &a);
    double bins[16] = {0};
    for (long i = 0; i < rows; i++) {
      double q = (q_edge[i] + q_edge[i + 1]) / 2, c = 299792.458;
      double weight = (q_edge[i + 1] - q_edge[i]) / (q * q);
      for (long j = 0; j < columns; j++) {
        double e = (e_edge[j] + e_edge[j + 1]) / 2;
        double x = (e / q + q / (2 * mass)) * c * (n / v_max);
        if (x >= n || e < 1.12) continue;
        long k = (long)x;
        long bin = (long)((e - 1.12) / 3.8);
        bins[bin > 15 ? 15 : bin] += weight * (eta[k] + (x - k) * (eta[k + 1] - eta[k])) * value[i * columns + j];
      }
    }
    clock_gettime(CLOCK_MONOTONIC, &b);
    double ms = (b.tv_sec - a.tv_sec) * 1e3 + (b.tv_nsec - a.tv_nsec) / 1e6;
    if (ms < best) best = ms;
    sum += bins[1];
  }
  printf("%.4f %g\n", best, sum);
  return 0;
}
