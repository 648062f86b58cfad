# SPDX-License-Identifier: GPL-3.0-or-later
# The libraries we stand on; the Debian packages are listed in ./setup.
find_package(PkgConfig REQUIRED)
pkg_check_modules(YAML REQUIRED IMPORTED_TARGET yaml-0.1)
pkg_check_modules(JANSSON REQUIRED IMPORTED_TARGET jansson)
pkg_check_modules(MD REQUIRED IMPORTED_TARGET libmd)
pkg_check_modules(ZLIB REQUIRED IMPORTED_TARGET zlib)
pkg_check_modules(OPENBLAS REQUIRED IMPORTED_TARGET openblas)

find_package(OpenMP REQUIRED COMPONENTS C)

find_library(LAPACKE_LIBRARY lapacke REQUIRED)
find_path(LAPACKE_INCLUDE lapacke.h REQUIRED)
add_library(mho_linear_algebra INTERFACE)
target_include_directories(mho_linear_algebra SYSTEM INTERFACE ${LAPACKE_INCLUDE})
target_link_libraries(mho_linear_algebra INTERFACE ${LAPACKE_LIBRARY} PkgConfig::OPENBLAS)

# GSL without its cblas, whose names would capture OpenBLAS's.
find_library(GSL_LIBRARY gsl REQUIRED)
find_path(GSL_INCLUDE gsl/gsl_integration.h REQUIRED)
add_library(mho_gsl INTERFACE)
target_include_directories(mho_gsl SYSTEM INTERFACE ${GSL_INCLUDE})
target_link_libraries(mho_gsl INTERFACE ${GSL_LIBRARY} PkgConfig::OPENBLAS m)

# Exact integers; Debian's package has no pkg-config file in every release.
find_library(FLINT_LIBRARY flint REQUIRED)
find_path(FLINT_INCLUDE flint/fmpz_mat.h REQUIRED)
add_library(mho_flint INTERFACE)
target_include_directories(mho_flint SYSTEM INTERFACE ${FLINT_INCLUDE})
target_link_libraries(mho_flint INTERFACE ${FLINT_LIBRARY})

# Automorphisms of graphs.
find_library(NAUTY_LIBRARY nauty REQUIRED)
find_path(NAUTY_INCLUDE nauty/nausparse.h REQUIRED)
add_library(mho_nauty INTERFACE)
target_include_directories(mho_nauty SYSTEM INTERFACE ${NAUTY_INCLUDE})
target_link_libraries(mho_nauty INTERFACE ${NAUTY_LIBRARY})
