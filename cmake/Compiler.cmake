# SPDX-License-Identifier: GPL-3.0-or-later
# Language and warnings for every target.
set(CMAKE_C_STANDARD 11)
set(CMAKE_C_STANDARD_REQUIRED ON)
set(CMAKE_C_EXTENSIONS ON) # POSIX, __float128
set(CMAKE_C_VISIBILITY_PRESET hidden)
set(CMAKE_POSITION_INDEPENDENT_CODE ON)
set(CMAKE_EXPORT_COMPILE_COMMANDS ON)

if(NOT CMAKE_BUILD_TYPE)
  set(CMAKE_BUILD_TYPE Release)
endif()

# No fast-math: the solver's error bounds rest on IEEE arithmetic.  Nobody reads errno
# after sqrt(), whose loops have vectors only without it.
add_compile_options(-Wall -Wextra -Wshadow -Wstrict-prototypes -Wmissing-prototypes
                    -Wvla -Wpointer-arith -Wwrite-strings -ffp-contract=off
                    -fno-math-errno)
add_compile_definitions(_GNU_SOURCE)

if(MHO_WERROR)
  add_compile_options(-Werror)
endif()
if(MHO_SANITIZE)
  add_compile_options(-fsanitize=address,undefined -fno-sanitize-recover=undefined
                      -fno-omit-frame-pointer)
  add_link_options(-fsanitize=address,undefined)
endif()
if(MHO_COVERAGE)
  add_compile_options(--coverage)
  add_link_options(--coverage)
endif()
