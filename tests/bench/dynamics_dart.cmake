pastern_bench(dynamics_dart SOURCES ${CMAKE_CURRENT_LIST_DIR}/dynamics_dart.cpp LINKS multibody_comparison CLI11::CLI11)
