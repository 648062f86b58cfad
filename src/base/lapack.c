/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "base/lapack.h"

#include <math.h>
#include <stdlib.h>

#define lapack_complex_float float complex
#define lapack_complex_double double complex
#include <lapacke.h>

/* From OpenBLAS's cblas.h, declared here because Debian's headers of that name
 * may belong to another BLAS. */
void openblas_set_num_threads(int threads);
int openblas_get_parallel(void);
char *openblas_get_config(void);
void dgemm_(const char *, const char *, const lapack_int *, const lapack_int *, const lapack_int *,
            const double *, const double *, const lapack_int *, const double *, const lapack_int *,
            const double *, double *, const lapack_int *);
void zgbtrf_(const lapack_int *, const lapack_int *, const lapack_int *, const lapack_int *,
             double complex *, const lapack_int *, lapack_int *, lapack_int *);
void zgbtrs_(const char *, const lapack_int *, const lapack_int *, const lapack_int *,
             const lapack_int *, const double complex *, const lapack_int *, const lapack_int *,
             double complex *, const lapack_int *, lapack_int *, size_t);

enum { OPENBLAS_SERIAL = 0 };

mho_status mho_lapack_check(mho_error *error)
{
  if (openblas_get_parallel() == OPENBLAS_SERIAL)
    return mho_fail(error, MHO_ERR_LINEAR_ALGEBRA, "base", NULL,
                    "the serial build of OpenBLAS gives wrong results under "
                    "threads; install libopenblas0-pthread");
  openblas_set_num_threads(1);
  return MHO_OK;
}

const char *mho_lapack_description(void) { return openblas_get_config(); }

static mho_status finish(const char *routine, lapack_int info,
                         mho_error *error)
{
  if (info == 0) return MHO_OK;
  if (info == LAPACK_WORK_MEMORY_ERROR)
    return mho_fail(error, MHO_ERR_MEMORY, "base", NULL, "out of memory in %s",
                    routine);
  return mho_fail(error, MHO_ERR_LINEAR_ALGEBRA, "base", NULL,
                  "%s failed with info %d", routine, (int)info);
}

mho_status mho_eigen_symmetric(int n, double *matrix, double *eigenvalues,
                               mho_error *error)
{
  mho_status status = mho_lapack_check(error);
  if (status != MHO_OK) return status;
  lapack_int info =
      LAPACKE_dsyevd(LAPACK_COL_MAJOR, 'V', 'L', n, matrix, n, eigenvalues);
  status = finish("dsyevd", info, error);
  for (int i = 0; status == MHO_OK && i < n; i++)
    if (!isfinite(eigenvalues[i]))
      status = mho_fail(error, MHO_ERR_NOT_FINITE, "base", NULL,
                        "dsyevd gave a level that is not finite");
  return status;
}

mho_status mho_eigen_complex(int n, double complex *matrix,
                             double complex *eigenvalues,
                             double complex *eigenvectors, mho_error *error)
{
  mho_status status = mho_lapack_check(error);
  if (status != MHO_OK) return status;
  double complex unused = 0;
  char vectors = eigenvectors ? 'V' : 'N';
  lapack_int info = LAPACKE_zgeev(LAPACK_COL_MAJOR, 'N', vectors, n, matrix, n,
                                  eigenvalues, &unused, 1,
                                  eigenvectors ? eigenvectors : &unused,
                                  eigenvectors ? n : 1);
  status = finish("zgeev", info, error);
  for (int i = 0; status == MHO_OK && i < n; i++)
    if (!isfinite(creal(eigenvalues[i])) || !isfinite(cimag(eigenvalues[i])))
      status = mho_fail(error, MHO_ERR_NOT_FINITE, "base", NULL,
                        "zgeev gave an eigenvalue that is not finite");
  return status;
}

mho_status mho_eigenvalues_complex(int n, double complex *matrix,
                                   double complex *eigenvalues,
                                   mho_error *error)
{
  return mho_eigen_complex(n, matrix, eigenvalues, NULL, error);
}

mho_status mho_eigenvalues_real(int n, double *matrix, double complex *eigenvalues,
                                mho_error *error)
{
  mho_status status = mho_lapack_check(error);
  double *part = malloc(2 * (size_t)n * sizeof *part), unused = 0;
  if (status == MHO_OK && !part)
    status = mho_fail(error, MHO_ERR_MEMORY, "base", NULL, "out of memory");
  if (status == MHO_OK)
    status = finish("dgeev", LAPACKE_dgeev(LAPACK_COL_MAJOR, 'N', 'N', n, matrix, n, part,
                                           part + n, &unused, 1, &unused, 1), error);
  for (int i = 0; status == MHO_OK && i < n; i++) {
    eigenvalues[i] = CMPLX(part[i], part[n + i]);
    if (!isfinite(part[i]) || !isfinite(part[n + i]))
      status = mho_fail(error, MHO_ERR_NOT_FINITE, "base", NULL,
                        "dgeev gave an eigenvalue that is not finite");
  }
  free(part);
  return status;
}

mho_status mho_singular_complex(int rows, int columns, double complex *matrix, double *values,
                                double complex *left, double complex *right_transposed,
                                mho_error *error)
{
  mho_status status = mho_lapack_check(error);
  int n = rows < columns ? rows : columns;
  double *work = malloc((size_t)n * sizeof *work);
  if (status == MHO_OK && !work)
    status = mho_fail(error, MHO_ERR_MEMORY, "base", NULL, "out of memory");
  if (status == MHO_OK)
    status = finish("zgesvd", LAPACKE_zgesvd(LAPACK_COL_MAJOR, 'S', 'S', rows, columns, matrix,
                                             rows, values, left, rows, right_transposed, n, work),
                    error);
  for (int i = 0; status == MHO_OK && i < n; i++)
    if (!isfinite(values[i]))
      status = mho_fail(error, MHO_ERR_NOT_FINITE, "base", NULL,
                        "zgesvd gave a value that is not finite");
  free(work);
  return status;
}

bool mho_band_factor(int n, int band, double complex *matrix, int *pivot)
{
  int rows = 3 * band + 1, info;
  zgbtrf_(&n, &n, &band, &band, matrix, &rows, pivot, &info);
  return info == 0;
}

void mho_band_solve(int n, int band, const double complex *factor, const int *pivot, int columns,
                    double complex *column)
{
  int rows = 3 * band + 1, info;
  zgbtrs_("N", &n, &band, &band, &columns, factor, &rows, pivot, column, &n, &info, 1);
}

mho_status mho_solve_complex(int n, double complex *matrix, int columns,
                             double complex *column, bool *singular,
                             mho_error *error)
{
  *singular = false;
  mho_status status = mho_lapack_check(error);
  if (status != MHO_OK) return status;
  lapack_int *pivot = malloc((size_t)n * sizeof *pivot);
  if (!pivot) return mho_fail(error, MHO_ERR_MEMORY, "base", NULL, "out of memory");
  lapack_int info =
      LAPACKE_zgesv(LAPACK_COL_MAJOR, n, columns, matrix, n, pivot, column, n);
  free(pivot);
  *singular = info > 0;
  if (info > 0) return MHO_OK;
  for (size_t i = 0; info == 0 && i < (size_t)n * (size_t)columns; i++)
    if (!isfinite(creal(column[i])) || !isfinite(cimag(column[i]))) *singular = true;
  return finish("zgesv", info, error);
}

mho_status mho_multiply_transposed(int n, const double *a, const double *b, double *product,
                                   mho_error *error)
{
  const double one = 1, zero = 0;
  mho_status status = mho_lapack_check(error);
  if (status == MHO_OK) dgemm_("N", "T", &n, &n, &n, &one, a, &n, b, &n, &zero, product, &n);
  return status;
}
