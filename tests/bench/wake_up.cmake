if(NOT TARGET bench_rig)
  add_subdirectory(${CMAKE_CURRENT_SOURCE_DIR}/rig)
endif()
pastern_bench(wake_up SOURCES wake_up.cpp LINKS bench_rig CLI11::CLI11)
