pastern_bench(false_adopt SOURCES false_adopt.cpp LINKS pastern_session CLI11::CLI11 Threads::Threads)
add_dependencies(bench_false_adopt pastern_hal_stub_plugin)
