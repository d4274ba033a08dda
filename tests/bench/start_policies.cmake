pastern_bench(start_policies SOURCES ${CMAKE_CURRENT_LIST_DIR}/start_policies.cpp LINKS pastern_train CLI11::CLI11)
