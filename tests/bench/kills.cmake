pastern_bench(kills SOURCES kills.cpp LINKS pastern_killed_session CLI11::CLI11)
add_dependencies(bench_kills pastern-onboard pastern_hal_stub_plugin)
