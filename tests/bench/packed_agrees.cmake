pastern_bench(packed_agrees SOURCES ${CMAKE_CURRENT_LIST_DIR}/packed_agrees.cpp LINKS pastern_fleet CLI11::CLI11)
