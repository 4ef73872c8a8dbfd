/* The loops of the kernels, written by hand: what a compiler makes of them is what ours are measured against. */
#include <math.h>
#include <stdint.h>

#define LANES 32

void iterate_logistic(double *restrict x, const double *restrict r, long groups, long steps) {
    for (long g = 0; g < groups; g++) {
        double v[LANES], w[LANES];
        for (int l = 0; l < LANES; l++) { v[l] = x[g * LANES + l]; w[l] = r[g * LANES + l]; }
        for (long n = 0; n < steps; n++)
            for (int l = 0; l < LANES; l++) v[l] = w[l] * v[l] * (1 - v[l]);
        for (int l = 0; l < LANES; l++) x[g * LANES + l] = v[l];
    }
}

void iterate_ricker(double *restrict x, const double *restrict r, long groups, long steps) {
    for (long g = 0; g < groups; g++) {
        double v[LANES], w[LANES];
        for (int l = 0; l < LANES; l++) { v[l] = x[g * LANES + l]; w[l] = r[g * LANES + l]; }
        for (long n = 0; n < steps; n++)
            for (int l = 0; l < LANES; l++) v[l] = v[l] * exp(w[l] * (1 - v[l]));
        for (int l = 0; l < LANES; l++) x[g * LANES + l] = v[l];
    }
}

void iterate_henon(double *restrict x, double *restrict y, const double *restrict a, const double *restrict b,
                   long groups, long steps) {
    for (long g = 0; g < groups; g++) {
        double v[LANES], w[LANES], p[LANES], q[LANES];
        for (int l = 0; l < LANES; l++) {
            v[l] = x[g * LANES + l]; w[l] = y[g * LANES + l]; p[l] = a[g * LANES + l]; q[l] = b[g * LANES + l];
        }
        for (long n = 0; n < steps; n++)
            for (int l = 0; l < LANES; l++) {
                double next = 1 - p[l] * (v[l] * v[l]) + w[l];
                w[l] = q[l] * v[l];
                v[l] = next;
            }
        for (int l = 0; l < LANES; l++) { x[g * LANES + l] = v[l]; y[g * LANES + l] = w[l]; }
    }
}

/* One column a group: transient, then every state into a half-open cell, with cells for below and above. */
void count_logistic(double *restrict x, const double *restrict r, long columns, long transient, long samples,
                    double low, double inverse, long rows, uint32_t *restrict counts) {
    iterate_logistic(x, r, columns, transient);
    for (long g = 0; g < columns; g++) {
        uint32_t *column = counts + g * (rows + 2);
        double v[LANES], w[LANES];
        for (int l = 0; l < LANES; l++) { v[l] = x[g * LANES + l]; w[l] = r[g * LANES + l]; }
        for (long n = 0; n < samples; n++)
            for (int l = 0; l < LANES; l++) {
                v[l] = w[l] * v[l] * (1 - v[l]);
                double t = (v[l] - low) * inverse;
                if (t >= 0 && t < rows) column[(long)t + 1]++;
                else if (t < 0) column[0]++;
                else column[rows + 1]++;
            }
        for (int l = 0; l < LANES; l++) x[g * LANES + l] = v[l];
    }
}
