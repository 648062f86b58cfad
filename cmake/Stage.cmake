# SPDX-License-Identifier: GPL-3.0-or-later
# One object library a stage of the house, and the library made of all of them.

# mho_stage(NAME [STAGES lower...] [LIBRARIES target...])
# Compiles src/NAME/*.c; a stage sees only what it names here.
function(mho_stage name)
  cmake_parse_arguments(STAGE "" "" "STAGES;LIBRARIES" ${ARGN})
  file(GLOB sources CONFIGURE_DEPENDS ${CMAKE_SOURCE_DIR}/src/${name}/*.c)
  if(NOT sources)
    add_library(mho_${name} INTERFACE)
    set(scope INTERFACE)
  else()
    add_library(mho_${name} OBJECT ${sources})
    set(scope PUBLIC)
    set_property(GLOBAL APPEND PROPERTY MHO_STAGES mho_${name})
  endif()
  target_include_directories(mho_${name} ${scope}
    $<BUILD_INTERFACE:${CMAKE_SOURCE_DIR}/include> $<BUILD_INTERFACE:${CMAKE_SOURCE_DIR}/src>)
  list(TRANSFORM STAGE_STAGES PREPEND mho_)
  target_link_libraries(mho_${name} ${scope} ${STAGE_STAGES} ${STAGE_LIBRARIES})
endfunction()

# libmho: everything, with only the public names visible.  The program and the
# tests link `mho_all`, the same objects with the internal names.
function(mho_library)
  get_property(stages GLOBAL PROPERTY MHO_STAGES)
  add_library(mho_all INTERFACE)
  add_library(mho SHARED)
  foreach(stage ${stages})
    target_sources(mho PRIVATE $<TARGET_OBJECTS:${stage}>)
    target_sources(mho_all INTERFACE $<TARGET_OBJECTS:${stage}>)
  endforeach()
  set(libraries mho_linear_algebra mho_gsl mho_flint mho_nauty PkgConfig::YAML PkgConfig::JANSSON PkgConfig::MD
                PkgConfig::ZLIB OpenMP::OpenMP_C m)
  target_link_libraries(mho PRIVATE ${libraries})
  target_link_libraries(mho_all INTERFACE ${libraries})
  target_include_directories(mho PUBLIC
    $<BUILD_INTERFACE:${CMAKE_SOURCE_DIR}/include> $<INSTALL_INTERFACE:${CMAKE_INSTALL_INCLUDEDIR}>)
  target_include_directories(mho_all INTERFACE ${CMAKE_SOURCE_DIR}/include ${CMAKE_SOURCE_DIR}/src)
  set_target_properties(mho PROPERTIES VERSION ${PROJECT_VERSION} SOVERSION ${PROJECT_VERSION_MAJOR}
                        LINKER_LANGUAGE C)

  install(TARGETS mho EXPORT mholecule LIBRARY DESTINATION ${CMAKE_INSTALL_LIBDIR})
  install(DIRECTORY ${CMAKE_SOURCE_DIR}/include/mho DESTINATION ${CMAKE_INSTALL_INCLUDEDIR})
  install(EXPORT mholecule NAMESPACE mholecule:: FILE mholecule-config.cmake
          DESTINATION ${CMAKE_INSTALL_LIBDIR}/cmake/mholecule)
  configure_file(${CMAKE_SOURCE_DIR}/cmake/mho.pc.in ${CMAKE_BINARY_DIR}/mho.pc @ONLY)
  install(FILES ${CMAKE_BINARY_DIR}/mho.pc DESTINATION ${CMAKE_INSTALL_LIBDIR}/pkgconfig)
endfunction()
