pastern_bench(file_damage SOURCES ${CMAKE_CURRENT_LIST_DIR}/file_damage.cpp
              LINKS pastern_file_damage pastern_proto CLI11::CLI11)
