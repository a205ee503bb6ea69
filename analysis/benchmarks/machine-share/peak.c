/* Time of fused multiply-adds that wait for nothing: twelve independent sums of four numbers. Prints operations a second. */
#include <immintrin.h>
#include <stdio.h>
#include <time.h>

int main(void)
{
    __m256d sum[12], a = _mm256_set1_pd(0.999), b = _mm256_set1_pd(1e-3);
    for (int k = 0; k < 12; k++)
        sum[k] = _mm256_set1_pd(k);
    double best = 1e9;
    for (int round = 0; round < 20; round++) {
        struct timespec begin, end;
        clock_gettime(CLOCK_PROCESS_CPUTIME_ID, &begin);
        for (long i = 0; i < 2000000; i++)
            for (int k = 0; k < 12; k++)
                sum[k] = _mm256_fmadd_pd(sum[k], a, b);
        clock_gettime(CLOCK_PROCESS_CPUTIME_ID, &end);
        double spent = (double)(end.tv_sec - begin.tv_sec) + 1e-9 * (double)(end.tv_nsec - begin.tv_nsec);
        best = spent < best ? spent : best;
    }
    for (int k = 1; k < 12; k++)
        sum[0] = _mm256_add_pd(sum[0], sum[k]);
    fprintf(stderr, "%g\n", sum[0][0]);
    printf("%.6g\n", 2.0 * 4.0 * 12.0 * 2e6 / best);
    return 0;
}
