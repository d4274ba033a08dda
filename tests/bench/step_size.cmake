pastern_bench(step_size SOURCES ${CMAKE_CURRENT_LIST_DIR}/step_size.cpp LINKS pastern_train CLI11::CLI11)
