# The sets of instructions that lanes are compiled for, and how. A set is also the name of its namespace (registers.h).
#   PASTERN_LANE_SETS        all sets of this processor family
#   PASTERN_LANE_SETS_HERE   those that the machine that builds can run: only they are tested
#   pastern_lanes(target set)   compiles all of a target's sources for a set
if(CMAKE_SYSTEM_PROCESSOR MATCHES "x86_64|AMD64")
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
