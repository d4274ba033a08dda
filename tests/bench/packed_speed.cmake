pastern_bench(packed_speed SOURCES ${CMAKE_CURRENT_LIST_DIR}/packed_speed.cpp LINKS pastern_fleet CLI11::CLI11)
