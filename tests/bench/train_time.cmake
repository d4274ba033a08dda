pastern_bench(train_time SOURCES ${CMAKE_CURRENT_LIST_DIR}/train_time.cpp LINKS pastern_train CLI11::CLI11)
