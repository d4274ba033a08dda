pastern_bench(random_robots SOURCES ${CMAKE_CURRENT_LIST_DIR}/random_robots.cpp ${CMAKE_SOURCE_DIR}/tests/hal_stub/random_robot.cpp
              LINKS pastern_hal_stub CLI11::CLI11 Threads::Threads)
