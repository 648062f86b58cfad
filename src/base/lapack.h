/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * The few dense routines we need, over LAPACKE and OpenBLAS.
 *
 * OpenBLAS is pinned to one thread (parallelism is ours, over molecules), and
 * its serial build is refused: it gives wrong results when several threads of
 * one program call it.  Matrices are square, column-major.
 */
#ifndef MHOLECULE_BASE_LAPACK_H
#define MHOLECULE_BASE_LAPACK_H

#include <complex.h>

#include <mho/status.h>

/* Checks the variant and pins the threads.  Cheap; every routine below calls
 * it.  Errors: MHO_ERR_LINEAR_ALGEBRA. */
MHO_MUST_USE mho_status mho_lapack_check(mho_error *error);

/* Eigenvalues (ascending, n) and orthonormal eigenvectors (columns, replacing
 * matrix[n*n]) of a real symmetric matrix.
 * Errors: MHO_ERR_LINEAR_ALGEBRA, MHO_ERR_NOT_FINITE. */
MHO_MUST_USE mho_status mho_eigen_symmetric(int n, double *matrix,
                                            double *eigenvalues,
                                            mho_error *error);

/* Eigenvalues of a general complex matrix[n*n], which is destroyed. */
MHO_MUST_USE mho_status mho_eigenvalues_complex(int n, double complex *matrix,
                                                double complex *eigenvalues,
                                                mho_error *error);

/* Eigenvalues of a general real matrix[n*n], which is destroyed. */
MHO_MUST_USE mho_status mho_eigenvalues_real(int n, double *matrix, double complex *eigenvalues,
                                             mho_error *error);

/* As mho_eigenvalues_complex, with right eigenvectors, column k for eigenvalue k. */
MHO_MUST_USE mho_status mho_eigen_complex(int n, double complex *matrix,
                                          double complex *eigenvalues,
                                          double complex *eigenvectors,
                                          mho_error *error);

/* Singular values (descending) of a complex matrix[rows*columns], column-major, which is
 * destroyed: matrix = left diag(values) right^+.  With n = min(rows, columns),
 * left[rows*n] has its vectors as columns, right_transposed[n*columns] as rows. */
MHO_MUST_USE mho_status mho_singular_complex(int rows, int columns, double complex *matrix,
                                             double *values, double complex *left,
                                             double complex *right_transposed, mho_error *error);

/* Solves matrix[n*n] x = column for `columns` right-hand sides, which become the
 * solutions; matrix is destroyed.  *singular, and MHO_OK, where a pivot is
 * exactly zero or a result overflows: then the columns hold nothing. */
MHO_MUST_USE mho_status mho_solve_complex(int n, double complex *matrix, int columns,
                                          double complex *column, bool *singular,
                                          mho_error *error);

/* Factors, in place, a matrix with so many diagonals on either side; its columns
 * have 3 band + 1 rows, entry (i, j) in row 2 band + i - j.  False where a pivot
 * is exactly zero.  Cheap enough for many small ones: the caller has had
 * mho_lapack_check. */
bool mho_band_factor(int n, int band, double complex *matrix, int *pivot);
void mho_band_solve(int n, int band, const double complex *factor, const int *pivot, int columns,
                    double complex *column);

/* product = a b^T, all n x n column-major. */
MHO_MUST_USE mho_status mho_multiply_transposed(int n, const double *a, const double *b,
                                                double *product, mho_error *error);

/* One line that names the linear algebra in use, for `mho --version`. */
const char *mho_lapack_description(void);

#endif
