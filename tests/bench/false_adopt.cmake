pastern_bench(false_adopt SOURCES false_adopt.cpp LINKS pastern_session CLI11::CLI11 Threads::Threads)
