pastern_bench(site_gaps SOURCES ${CMAKE_CURRENT_LIST_DIR}/site_gaps.cpp LINKS pastern_train CLI11::CLI11)
