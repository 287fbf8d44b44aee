/* T(E) of a periodic stack of constant layers, one energy at a time: what a compiled loop needs for the same answer. */
#include <math.h>

static void layer(double kinetic, double mass, double thickness, double c, double out[4]) {
    double q = kinetic * mass / c, k = sqrt(fabs(q)), z = k * thickness, cosine, sine;
    if (z < 1e-7) { cosine = 1; sine = thickness; }
    else if (q > 0) { cosine = cos(z); sine = sin(z) / k; }
    else { double grow = exp(z); cosine = (grow + 1 / grow) / 2; sine = (grow - 1 / grow) / (2 * k); }
    out[0] = out[3] = cosine; out[1] = mass * sine; out[2] = -kinetic / c * sine;
}

static void times(const double p[4], const double q[4], double out[4]) {
    double a = p[0] * q[0] + p[1] * q[2], b = p[0] * q[1] + p[1] * q[3];
    double g = p[2] * q[0] + p[3] * q[2], d = p[2] * q[1] + p[3] * q[3];
    out[0] = a; out[1] = b; out[2] = g; out[3] = d;
}

void transmission(int energies, const double *energy, int layers, const double *thickness, const double *edge,
                  const double *mass, int periods, double lead_mass, double c, double *result) {
    for (int i = 0; i < energies; i++) {
        double cell[4] = {1, 0, 0, 1}, all[4] = {1, 0, 0, 1}, next[4];
        for (int j = 0; j < layers; j++) {
            layer(energy[i] - edge[j], mass[j], thickness[j], c, next);
            times(next, cell, cell);
        }
        for (int n = periods; n; n >>= 1) {
            if (n & 1) times(cell, all, all);
            times(cell, cell, cell);
        }
        double g = sqrt(energy[i] * lead_mass / c) / lead_mass;
        double even = g * (all[0] + all[3]), odd = all[2] - g * g * all[1];
        result[i] = 4 * g * g / (even * even + odd * odd);
    }
}
