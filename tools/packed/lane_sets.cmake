# The sets of instructions that lanes are compiled for, and how. A set is also the name of its namespace (registers.h).
#   PASTERN_LANE_SETS        all sets of this processor family (the same in instruction_set.h)
#   PASTERN_LANE_SETS_HERE   those that the machine that builds can run: only they are tested
#   pastern_lanes(target set)   compiles all of a target's sources for a set
#   pastern_lane_objects(target ENTRY function SOURCES sources... LINKS targets...)
#       adds to a library one object for each set, in which nothing is visible but pastern::packed::<set>::<function>
if(CMAKE_BUILD_TYPE STREQUAL Sanitizer AND CMAKE_SYSTEM_PROCESSOR MATCHES "x86_64|AMD64")
  # One set is enough to find what a sanitizer finds: the source is the same, and each takes minutes to compile so.
  set(PASTERN_LANE_SETS plain)
  set(PASTERN_LANES_ONLY PASTERN_LANES_PLAIN_ONLY)
elseif(CMAKE_SYSTEM_PROCESSOR MATCHES "x86_64|AMD64")
  set(PASTERN_LANE_SETS plain avx2 avx512)
elseif(CMAKE_SYSTEM_PROCESSOR MATCHES "aarch64|arm64")
  set(PASTERN_LANE_SETS neon)
else()
  set(PASTERN_LANE_SETS plain)
endif()
set(PASTERN_LANES_FLAGS_plain "")
set(PASTERN_LANES_FLAGS_neon "")
set(PASTERN_LANES_FLAGS_avx2 -mavx2 -mfma)
set(PASTERN_LANES_FLAGS_avx512 -mavx512f -mavx512dq -mavx512vl -mavx512bw -mfma -mprefer-vector-width=512)
# gcc 12 warns of its own headers' undefined vectors (gcc bug 105593); the other sets compile the same source with the warnings on.
set(PASTERN_LANES_QUIET_avx512 -Wno-uninitialized -Wno-maybe-uninitialized)

include(CheckCXXSourceRuns)
set(PASTERN_LANE_SETS_HERE "")
foreach(set IN LISTS PASTERN_LANE_SETS)
  set(features "")
  foreach(flag IN LISTS PASTERN_LANES_FLAGS_${set})
    if(NOT flag MATCHES "prefer")
      string(REPLACE "-m" "" feature ${flag})
      string(APPEND features " && __builtin_cpu_supports(\"${feature}\")")
    endif()
  endforeach()
  if(features STREQUAL "")
    list(APPEND PASTERN_LANE_SETS_HERE ${set})
  else()
    check_cxx_source_runs("int main() { return 1${features} ? 0 : 1; }" PASTERN_RUNS_${set})
    if(PASTERN_RUNS_${set})
      list(APPEND PASTERN_LANE_SETS_HERE ${set})
    else()
      message(STATUS "This machine cannot run lanes of ${set}: built, not tested.")
    endif()
  endif()
endforeach()

function(pastern_lanes target set)
  target_compile_definitions(${target} PRIVATE PASTERN_LANES_SET=${set})
  # Speed without giving up NaN: no -ffast-math. Lanes are not passed between functions that are really called across sets, so
  # their calling convention does not matter.
  target_compile_options(${target} PRIVATE $<$<NOT:$<CONFIG:Sanitizer>>:-O3> -fno-math-errno -fno-trapping-math
                         ${PASTERN_LANES_FLAGS_${set}} -Wno-psabi ${PASTERN_LANES_QUIET_${set}})
endfunction()

# What is compiled for a set instantiates templates that are not of lanes (std::vector<double>). Left visible, the linker would keep
# one copy of each for the whole program, and the plain path would run wide code. So each set's objects become one, the groups that
# the linker merges by name are dissolved, and all names but the entry's are made local (by way of weak, or those that gcc marks as
# unique in the process would stay).
function(pastern_lane_objects target)
  cmake_parse_arguments(ARG "" "ENTRY" "SOURCES;LINKS" ${ARGN})
  string(LENGTH ${ARG_ENTRY} entry_length)
  foreach(set IN LISTS PASTERN_LANE_SETS)
    add_library(${target}_${set} OBJECT ${ARG_SOURCES})
    target_link_libraries(${target}_${set} PRIVATE ${ARG_LINKS} pastern_warnings)
    target_include_directories(${target}_${set} PRIVATE ${CMAKE_SOURCE_DIR})
    set_target_properties(${target}_${set} PROPERTIES POSITION_INDEPENDENT_CODE ON)
    pastern_lanes(${target}_${set} ${set})
    string(LENGTH ${set} set_length)
    set(object ${CMAKE_CURRENT_BINARY_DIR}/${target}_${set}.o)
    set(entry "_ZN7pastern6packed${set_length}${set}${entry_length}${ARG_ENTRY}E*")
    add_custom_command(OUTPUT ${object}
      COMMAND ${CMAKE_LINKER} -r --force-group-allocation -o ${object}.visible $<TARGET_OBJECTS:${target}_${set}>
      COMMAND ${CMAKE_OBJCOPY} --wildcard --weaken-symbol=!${entry} --weaken-symbol=* ${object}.visible ${object}.weak
      COMMAND ${CMAKE_OBJCOPY} --wildcard --keep-global-symbol=${entry} ${object}.weak ${object}
      DEPENDS ${target}_${set} $<TARGET_OBJECTS:${target}_${set}> COMMAND_EXPAND_LISTS VERBATIM)
    set_source_files_properties(${object} PROPERTIES EXTERNAL_OBJECT ON GENERATED ON)
    target_sources(${target} PRIVATE ${object})
  endforeach()
endfunction()
