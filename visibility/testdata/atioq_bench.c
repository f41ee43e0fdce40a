/* Altitude and azimuth of a grid of fields and slots by ERFA's atioq, one
 * core. Arguments: fields, slots, first instant (Unix s), step (s), latitude,
 * longitude (rad), elevation (m), rounds. Prints cells per second (best
 * round), then altitude and azimuth of every 997th cell, field by field. */
#include <erfa.h>
#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <time.h>

static double seconds(void) {
    struct timespec t;
    clock_gettime(CLOCK_MONOTONIC, &t);
    return t.tv_sec + 1e-9 * t.tv_nsec;
}

int main(int argc, char **argv) {
    if (argc != 9) return 2;
    int fields = atoi(argv[1]), slots = atoi(argv[2]), rounds = atoi(argv[8]);
    double start = atof(argv[3]), step = atof(argv[4]);
    double lat = atof(argv[5]), lon = atof(argv[6]), elev = atof(argv[7]);
    double *ri = malloc(sizeof(double) * fields), *di = malloc(sizeof(double) * fields);
    double *alt = malloc(sizeof(double) * fields * slots), *az = malloc(sizeof(double) * fields * slots);
    eraASTROM *at = malloc(sizeof(eraASTROM) * slots);
    if (!ri || !di || !alt || !az || !at) return 1;

    /* Prepared outside the clock: one intermediate place a field, mid-way,
     * and one set of site parameters a slot. */
    double mid = start + step * slots / 2, eo;
    for (int i = 0; i < fields; i++) {
        double ra = fmod(i * M_PI * (3 - sqrt(5)), 2 * M_PI);
        double dec = asin(1 - (2.0 * i + 1) / fields);
        eraAtci13(ra, dec, 0, 0, 0, 0, 2440587.5, (mid + 69.184) / 86400, &ri[i], &di[i], &eo);
    }
    for (int k = 0; k < slots; k++)
        if (eraApio13(2440587.5, (start + k * step) / 86400, 0, lon, lat, elev, 0, 0, 0, 0, 0, 0.55, &at[k]) < 0)
            return 1;

    double best = 0;
    for (int r = 0; r < rounds; r++) {
        double t = seconds();
        for (int i = 0; i < fields; i++)
            for (int k = 0; k < slots; k++) {
                double zenith, ha, dob, rob;
                eraAtioq(ri[i], di[i], &at[k], &az[i * slots + k], &zenith, &ha, &dob, &rob);
                alt[i * slots + k] = M_PI / 2 - zenith;
            }
        t = seconds() - t;
        if ((double)fields * slots / t > best) best = (double)fields * slots / t;
    }
    printf("%.6g\n", best);
    for (int c = 0; c < fields * slots; c += 997) printf("%.12f %.12f\n", alt[c], az[c]);
    return 0;
}
